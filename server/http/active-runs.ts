import type { RunStart } from '@/shared/archive/run-records';
import type { RunSummary, RunView } from '@/shared/contracts/runs';
import type { RunDriver } from '../engine/run-driver';
import type { RunChange } from '../engine/run-driver-parts';
import type { RigSupervisor } from '../engine/rig-supervisor';
import type { RunListRow } from '../store/runs-read';
import type { LiveChange } from '../interfaces/process-post';
import { liveSummaryOf, progressOf, runViewOf } from './run-view';

export type ActiveRun = RunListRow & { start: RunStart };

/**
 * The runs that this process drives, with all that a screen needs of them in memory: hold, stop and the live stream go on
 * while the database is away.
 */
export class ActiveRuns {
  private readonly byId = new Map<string, ActiveRun>();

  constructor(private readonly parts: { supervisor: RigSupervisor; onChange(runId: string, change: LiveChange): void }) {
    parts.supervisor.onChange((driver, change) => this.changed(driver, change));
  }

  /** Before the driver of the run begins. */
  add(run: ActiveRun): void {
    this.byId.set(run.id, run);
  }

  remove(runId: string): void {
    this.byId.delete(runId);
  }

  find(labId: string, runId: string): { run: ActiveRun; driver: RunDriver } | null {
    const run = this.byId.get(runId);
    const driver = this.parts.supervisor.driverOf(runId);
    return run === undefined || run.labId !== labId || driver === null ? null : { run, driver };
  }

  view(labId: string, runId: string): RunView | null {
    const found = this.find(labId, runId);
    return found === null ? null : runViewOf(found.run, found.driver.facts());
  }

  /** The runs of a lab that this process drives, as they are now, newest first. */
  summaries(labId: string): RunSummary[] {
    const found = [...this.byId.values()].flatMap((run) => this.find(labId, run.id) ?? []);
    found.sort((one, other) => other.run.createdAt - one.run.createdAt);
    return found.map(({ run, driver }) => liveSummaryOf(run, driver.facts()));
  }

  /** All runs that this process drives. */
  all(): ActiveRun[] {
    return [...this.byId.values()];
  }

  private changed(driver: RunDriver, change: RunChange): void {
    const run = this.byId.get(driver.runId);
    if (run === undefined) return;
    this.parts.onChange(run.id, { events: change.events, steps: change.steps, progress: progressOf(runViewOf(run, change.facts)) });
    if (driver.isDone()) this.byId.delete(run.id);
  }
}
