import type { RunStart } from '@/shared/archive/run-records';
import type { LiveMessages, RunSummary, RunView } from '@/shared/contracts/runs';
import type { WaitingView } from '@/shared/contracts/waiting';
import { factsOf, plannedRun, type RunFacts, type WaitingFacts } from '../engine/run-facts';
import { isRunOver } from '../engine/chart';
import type { RunSnapshot } from '../engine/run-context';
import { restored } from '../engine/stored-snapshot';
import { findRun, readSteps, type RunListRow, type RunRecord } from '../store/runs-read';
import { isoOf, isoOrNull } from './maker';
import { positionViewOf } from './position-view';
import { notFound } from './problem-error';
import { startUtcMsOf } from './run-window';
import type { Services } from './services';

/** @throws ProblemError where the lab has no such run */
export async function loadRun(services: Services, labId: string, runId: string): Promise<RunRecord> {
  const run = await findRun(services.database.db, labId, runId);
  if (run === null) throw notFound('run');
  return run;
}

/** What a list shows of a run. */
export function runSummaryOf(row: RunListRow): RunSummary {
  return {
    id: row.id,
    rigId: row.rigId,
    rigName: row.rigName,
    protocolId: row.protocolId,
    protocolName: row.protocolName,
    protocolRevision: row.protocolRevision,
    state: row.state,
    rehearsal: row.rehearsal,
    operator: row.operator,
    createdAt: isoOf(row.createdAt),
    startedAt: isoOrNull(row.startedAt),
    endedAt: isoOrNull(row.endedAt),
    predictedEndAt: isoOrNull(row.predictedEndAt),
  };
}

/** A run as the database holds it, whoever drives it. */
export async function storedRunView(services: Services, run: RunRecord): Promise<RunView> {
  const quarantined = services.supervisor.quarantinedOf(run.rigId);
  const aside = quarantined?.start.runId === run.id ? quarantined : null;
  const view = runViewOf(run, await factsOfStored(services, run, aside?.why ?? null));
  return aside === null ? view : { ...view, quarantine: { cause: aside.cause, why: aside.why } };
}

/** What a list shows of a run, by the engine that drives it. */
export function liveSummaryOf(run: RunListRow, facts: RunFacts): RunSummary {
  return {
    ...runSummaryOf(run),
    state: facts.state,
    startedAt: isoOrNull(facts.startedAtUtcMs),
    endedAt: isoOrNull(facts.endedAtUtcMs),
    predictedEndAt: isoOrNull(facts.predictedEndUtcMs),
  };
}

/** Columns and facts of the engine as one view. */
export function runViewOf(run: RunListRow & { start: RunStart }, facts: RunFacts): RunView {
  const { start } = run;
  return {
    ...liveSummaryOf(run, facts),
    notes: start.notes,
    massSetLabel: start.massSetLabel,
    reason: facts.reason,
    current: facts.current,
    deadlineAt: isoOrNull(facts.deadlineUtcMs),
    dwellsDone: facts.dwellsDone,
    dwellsPlanned: facts.dwellsPlanned,
    holdAfterDwell: facts.holdAfterDwell,
    finishing: facts.finishing === null ? null : finishingViewOf(facts.finishing),
    dwellsGood: facts.dwellsGood,
    waiting: facts.waiting === null ? null : waitingViewOf(facts.waiting),
    reversal: facts.reversal,
    position: facts.position === null ? null : positionViewOf(start.rig, facts.position),
    intervention:
      facts.intervention === null
        ? null
        : {
            kind: facts.intervention.kind,
            by: facts.intervention.by,
            serverAt: isoOf(facts.intervention.serverAtUtcMs),
            confirmedAt: isoOrNull(facts.intervention.confirmedAtUtcMs),
          },
    mayResume: facts.mayResume,
    maySkip: facts.maySkip,
    lastSeq: facts.lastSeq,
    quarantine: null,
    rig: start.rig,
    protocol: start.protocol,
    simulated:
      start.simulated === null ? null : { trueG: start.simulated.trueG, seed: start.simulated.seed, rateHz: start.simulated.rateHz },
    ...(start.shuffleSeed === undefined ? {} : { shuffleSeed: start.shuffleSeed }),
  };
}

/** Tells those who follow a run what is stored of it now: no driver does. */
export function tellStored(services: Services, { labId, id }: { labId: string; id: string }): void {
  const telling = async () => {
    const run = await findRun(services.database.db, labId, id);
    if (run !== null) services.runChanged(id, { events: [], steps: [], progress: progressOf(await storedRunView(services, run)) });
  };
  services.background(telling(), 'telling of a run that nobody drives');
}

/** Rig and protocol went out with the first snapshot: with every change they would be nine tenths of all that is sent. */
export function progressOf(view: RunView): LiveMessages['progress'] {
  const { state, startedAt, endedAt, predictedEndAt, reason, current, deadlineAt } = view;
  const { dwellsGood, waiting, reversal, finishing } = view;
  const { dwellsDone, dwellsPlanned, holdAfterDwell, position, intervention, mayResume, maySkip, lastSeq } = view;
  return {
    ...{ state, startedAt, endedAt, predictedEndAt, reason, current, deadlineAt },
    ...{ dwellsGood, waiting, reversal, finishing, quarantine: view.quarantine },
    ...{ dwellsDone, dwellsPlanned, holdAfterDwell, position, intervention, mayResume, maySkip, lastSeq },
  };
}

const finishingViewOf = ({ by, askedUtcMs, finishByUtcMs, withdrawnBy }: NonNullable<RunFacts['finishing']>) => ({
  ...{ by, withdrawnBy },
  at: isoOf(askedUtcMs),
  overBy: isoOrNull(finishByUtcMs),
});

const notDriven = { ok: false, why: 'The run is not driven by this server.' };

function waitingViewOf({ kind, text, givesUpUtcMs, otherwise, firstLookUtcMs, found, mayConfirm }: WaitingFacts): WaitingView {
  return {
    ...{ kind, text, otherwise, mayConfirm },
    givesUpAt: isoOrNull(givesUpUtcMs),
    firstLookAt: isoOf(firstLookUtcMs),
    samples: found?.samples ?? null,
    readings: found?.readings ?? [],
  };
}

/** The snapshot that tells of the run; null where there is none, or where the run went another way than it says. */
function tellingSnapshot(run: RunRecord, isAside: boolean): RunSnapshot | null {
  const ended = ['finished', 'stopped', 'failed'].includes(run.state);
  const snapshot = isAside ? null : restored(run.snapshot, run.chartVersion);
  return snapshot === null || (ended && !isRunOver(snapshot)) ? null : snapshot;
}

async function factsOfStored(services: Services, run: RunRecord, why: string | null): Promise<RunFacts> {
  const planned = plannedRun(run.start, startUtcMsOf(run));
  const snapshot = tellingSnapshot(run, why !== null);
  if (snapshot !== null)
    return factsOf({
      start: run.start,
      snapshot,
      nowUtcMs: services.clock.utcMs(),
      arm: null,
      lockedBy: null,
      lastSeq: run.lastSeq,
      predictedEndUtcMs: run.predictedEndAt,
      planned,
    });
  const steps = await readSteps(services.database.db, { labId: run.labId, runId: run.id });
  return {
    runId: run.id,
    state: run.state,
    reason: run.failure ?? why ?? '',
    reasonCode: '',
    startedAtUtcMs: run.startedAt,
    endedAtUtcMs: run.endedAt,
    predictedEndUtcMs: run.predictedEndAt,
    current: steps.find((step) => step.outcome === null) ?? null,
    deadlineUtcMs: null,
    dwellsDone: steps.filter((step) => step.kind === 'dwell' && step.outcome === 'done').length,
    dwellsPlanned: planned.dwells,
    plannedEndUtcMs: planned.endUtcMs,
    holdAfterDwell: false,
    finishing: null,
    dwellsGood: steps.filter((step) => step.kind === 'dwell' && step.outcome === 'done' && step.good !== false).length,
    lastDwellsAreGood: false,
    dwellsUnpaired: 0,
    waiting: null,
    reversal: null,
    loud: null,
    position: null,
    intervention: null,
    mayResume: notDriven,
    maySkip: { ...notDriven, seq: null },
    lastSeq: run.lastSeq,
  };
}
