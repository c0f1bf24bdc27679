import type { RunStart } from '@/shared/archive/run-records';
import type { Instant } from '../interfaces/clock';
import { Draft, nothingOut } from './draft';
import { finishRefusal } from './finishing';
import type { Advance, Arm, RunEvent, RunSnapshot } from './run-context';
import type { Answer } from './run-driver-parts';
import { mayResume, maySkip } from './run-facts';

/** What of a driver decides about a request. */
export interface RequestedRun {
  start: RunStart;
  snapshot(): RunSnapshot;
  now(): Instant;
  arm(): Arm | null;
  lockedBy(): string | null;
  isOver(): boolean;
  /** The database is away. */
  mayNotWrite(): boolean;
  /** Puts the event through the chart; null where the driver has let go of the run. */
  take(event: RunEvent): Promise<Advance | null>;
}

const withoutDatabase: Answer = {
  ok: false,
  why: 'The database does not answer at the moment; nothing is set in motion before it does.',
};

/**
 * What people ask of a run that lets motion happen: answered when it is saved, for nothing goes to the controller before. Refused requests change
 * nothing.
 */
export class RunRequests {
  constructor(private readonly run: RequestedRun) {}

  /** The run goes on past the end of the present step after all. */
  withdrawHold(by: string): Promise<Answer> {
    return this.ask({ type: 'withdraw-hold', at: this.run.now(), by }, 'hold-after-dwell-withdrawn');
  }

  /** The run ends on a whole pair: with the one under way, or the last one after which it is over by `finishByUtcMs`. `by` empty: the night window asks, or the few good dwells. */
  async finishEarly(by: string, finishByUtcMs: number | null = null): Promise<Answer> {
    const event: RunEvent = { type: 'finish-early', at: this.run.now(), by, finishByUtcMs };
    // Rules ask again and again: what is refused to them is no event of the run.
    const { context } = this.run.snapshot();
    const why = by === '' && !this.run.isOver() ? finishRefusal(new Draft(this.run.start, event, { context, out: nothingOut })) : null;
    return why === null ? this.ask(event, 'finish-asked') : { ok: false, why };
  }

  /** The run goes on to the end of its protocol after all. */
  withdrawFinish(by: string): Promise<Answer> {
    return this.ask({ type: 'withdraw-finish', at: this.run.now(), by }, 'finish-withdrawn');
  }

  async resume(by: string): Promise<Answer> {
    const { at, arm, lockedBy } = this.standing();
    if (this.run.mayNotWrite()) return withoutDatabase;
    const allowed = mayResume(this.run.start, this.run.snapshot(), { utcMs: at.utcMs, arm, lockedBy });
    return allowed.ok ? this.ask({ type: 'resume', at, by, arm }, 'resumed') : { ok: false, why: allowed.why };
  }

  /** A person has done what the prompt asks for, and the rig was armed again; the next step may move. */
  async confirmPrompt(by: string): Promise<Answer> {
    const { at, arm, lockedBy } = this.standing();
    if (lockedBy !== null) return { ok: false, why: lockedBy };
    if (this.run.snapshot().state !== 'awaiting') return { ok: false, why: 'There is no prompt to be confirmed.' };
    return this.ask({ type: 'confirm-prompt', at, by, arm }, 'prompt-confirmed');
  }

  /** Leaves out the rest of the step whose row is `seq`. */
  async skip(by: string, seq: number): Promise<Answer> {
    const { at, arm, lockedBy } = this.standing();
    if (this.run.mayNotWrite()) return withoutDatabase;
    const allowed = maySkip(this.run.start, this.run.snapshot(), { utcMs: at.utcMs, arm, lockedBy, seq });
    return allowed.ok ? this.ask({ type: 'skip', at, by, arm, seq }, 'skipped') : { ok: false, why: allowed.why };
  }

  private standing(): { at: Instant; arm: Arm | null; lockedBy: string | null } {
    const arm = this.run.arm();
    return {
      at: this.run.now(),
      arm: arm === null ? null : { name: arm.name, untilUtcMs: arm.untilUtcMs },
      lockedBy: this.run.lockedBy(),
    };
  }

  /** `did`: the event of the log that says it was done. */
  private async ask(event: RunEvent, did: string): Promise<Answer> {
    if (this.run.isOver()) return { ok: false, why: 'The run is over.' };
    if (this.run.mayNotWrite()) return withoutDatabase;
    const result = await this.run.take(event);
    if (result === null) return { ok: false, why: 'This server no longer drives the run.' };
    if (result.events.some(({ kind }) => kind === did)) return { ok: true, serverAtUtcMs: event.at.utcMs };
    const refusal = result.events.find(({ kind }) => kind === `${event.type}-refused`);
    return { ok: false, why: String(refusal?.data['why'] ?? 'The run is over.') };
  }
}
