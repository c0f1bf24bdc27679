import type { Sha256 } from '@/shared/archive/chain';
import type { RunStart } from '@/shared/archive/run-records';
import { type Finding, refusalCodeOf } from '@/shared/protocol/finding';
import { planTimeline } from '@/shared/protocol/timeline';
import type { Clock } from '../interfaces/clock';
import type { RunJournals } from '../interfaces/run-journal';
import { RigLostError, type RunStore, type StoredRun } from '../interfaces/run-store';
import type { SampleReader } from '../interfaces/sample-reader';
import type { TurntableLink } from '../interfaces/turntable-link';
import { isRunOver } from './chart';
import { checkAtStart } from './check-at-start';
import { givenUp } from './given-up';
import { keptRun } from './kept-run';
import { type Arm, CHART_VERSION } from './run-context';
import { RunDriver } from './run-driver';
import type { RunChange } from './run-driver-parts';
import { type OwnEffect, restored } from './stored-snapshot';

export interface SupervisorParts {
  store: RunStore;
  journals: RunJournals;
  clock: Clock;
  /** The time that the run of a rig keeps to, which its link tells instants in too; without it `clock`. */
  clockOf?(rigId: string): Clock;
  sha256: Sha256;
  /** The open link of a rig; null while it has none. The same object for as long as a run may use it. */
  linkOf(rigId: string): TurntableLink | null;
  armOf(rigId: string): Arm | null;
  /** Why nobody answers for a rig any more; empty where that is not known. */
  whyDisarmed(rigId: string): string;
  /** In a sentence, whose personal locks are on a rig; null while there are none. */
  lockedBy(rigId: string): string | null;
  /** In a sentence, who moves the rig by hand; null while nobody does. */
  guidedBy(rigId: string): string | null;
  /** Of this process, for the log of runs that it takes up. */
  serverName?: string;
  /** What was measured lately on a rig. */
  samplesOf?(rigId: string): SampleReader;
  /** Notifications and the end of the arm. */
  perform(effect: OwnEffect, start: RunStart): void;
  /** Whether an error only says that the database does not answer just now: what it was asked may be asked again. */
  isPassing(error: unknown): boolean;
  /** A run cannot be taken up, or broke off; its rig stays blocked until somebody decides. */
  onQuarantine?(run: QuarantinedRun): void;
  /** An error that is nobody's answer, to be logged. */
  onError?(error: unknown, start: RunStart): void;
}

export type StartRefusalCode = 'rig-busy' | 'locked' | 'not-armed' | 'not-ready' | 'protocol-refused' | 'not-yet';

/** A start that is refused, with a sentence that says what would be right. */
export class StartRefused extends Error {
  constructor(
    readonly code: StartRefusalCode,
    message: string,
    readonly findings: readonly Finding[] = [],
  ) {
    super(message);
  }
}

/** A run that this version cannot take up or carry on: nothing is done with it, and its rig stays blocked until somebody decides. */
export interface QuarantinedRun {
  start: RunStart;
  why: string;
  cause: QuarantineCause;
}

/** `other-version`: what is stored was written by another version; `no-link`: its rig has none; `broken`: it could not be read, or not be written on. */
export type QuarantineCause = 'other-version' | 'no-link' | 'broken';

const hasEnded = ({ snapshot, chartVersion }: StoredRun) => {
  const found = restored(snapshot, chartVersion);
  return found !== null && isRunOver(found);
};

/** What lies at the bottom of an error, as a sentence. */
function innermost(error: unknown): string {
  if (error instanceof Error && error.cause instanceof Error) return innermost(error.cause);
  const message = error instanceof Error ? error.message : String(error);
  return message.endsWith('.') ? message : `${message}.`;
}

const thenEnd = 'Look at the rig, then end the run.';

const LONGEST_PAUSE_MS = 5_000;
/** A process that has lost a rig is told so within this, ms: it renews its leases as often. */
const LOSS_KNOWN_MS = 1_000;

export type SupervisorListener = (driver: RunDriver, change: RunChange) => void;

/** Owns the drivers: one run to a rig, unfinished ones taken up at boot. */
export class RigSupervisor {
  private readonly byRig = new Map<string, RunDriver>();
  private readonly quarantine = new Map<string, QuarantinedRun>();
  /** Found unfinished, and neither driven nor quarantined yet. */
  private readonly undecided = new Map<string, StoredRun>();
  private readonly listeners = new Set<SupervisorListener>();
  private closed = false;

  constructor(private readonly parts: SupervisorParts) {}

  /**
   * Takes up the unfinished runs of the rigs that this process drives, with what an earlier one kept of them in its journal: each is
   * resumed, held or stopped as its protocol says. Call it when their links are being opened. Resolves when each was tried once; one for
   * which the database did not answer is tried again by itself, and keeps none of the others waiting.
   */
  async recover(isOurs: (rigId: string) => boolean = () => true): Promise<void> {
    for (const found of await this.parts.store.unfinished()) {
      const { rigId } = found.start;
      if (this.closed || !isOurs(rigId) || this.byRig.has(rigId) || this.undecided.has(rigId)) continue;
      this.undecided.set(rigId, found);
      await this.takeUp(found);
    }
  }

  /**
   * Why a run may not start now; nothing is changed. What needs the plan comes last.
   * @throws StartRefused
   */
  assertMayStart(start: RunStart): TurntableLink {
    this.assertFree(start.rigId);
    const seen = this.parts.linkOf(start.rigId);
    const findings = checkAtStart(
      start,
      { controller: seen?.controller() ?? null, limits: seen?.limits() ?? null },
      this.parts.clock.utcMs(),
    );
    if (findings.length > 0) {
      throw new StartRefused(refusalCodeOf(findings), findings.map(({ message }) => message).join(' '), findings);
    }
    const link = this.readyLink(start.rigId);
    this.assertArmed(start);
    return link;
  }

  /**
   * Starts a run that the store already holds.
   * @throws StartRefused
   */
  startRun(start: RunStart): RunDriver {
    const driver = this.drive(start, null, this.assertMayStart(start));
    driver.start();
    return driver;
  }

  /** The run of a rig that has not ended, if this process drives one. */
  activeOf(rigId: string): RunDriver | null {
    return this.byRig.get(rigId) ?? null;
  }

  /** Whether a run of the rig goes on here. */
  drives(rigId: string): boolean {
    return this.byRig.get(rigId)?.isOver() === false;
  }

  driverOf(runId: string): RunDriver | null {
    return [...this.byRig.values()].find((driver) => driver.runId === runId) ?? null;
  }

  /** In a sentence, the run that has the rig; null while none has. */
  takenBy(rigId: string): string | null {
    const active = this.byRig.get(rigId);
    if (active !== undefined && !active.isOver())
      return `The rig is taken by another run (${active.facts().state}). Wait for its end, or stop it.`;
    if (this.undecided.has(rigId))
      return 'The rig is taken by an unfinished run, which this server takes up as soon as the database answers. Wait a little.';
    const quarantined = this.quarantine.get(rigId);
    return quarantined === undefined ? null : `The rig is blocked by an unfinished run. ${quarantined.why}`;
  }

  quarantinedOf(rigId: string): QuarantinedRun | null {
    return this.quarantine.get(rigId) ?? null;
  }

  /**
   * Ends a quarantined run as failed, in the name of the person who looked at the rig, and frees the rig. What a journal kept of it is
   * brought into its log first; where that cannot be, it is set aside.
   * @throws StaleRunError where another process has written into the run
   */
  async giveUp(rigId: string, by: string): Promise<void> {
    const run = this.quarantine.get(rigId);
    if (run === undefined) return;
    const { store, clock, sha256 } = this.parts;
    const { labId, runId } = run.start;
    const stored = await this.withItsJournal(run.start);
    if (stored !== null && !hasEnded(stored)) {
      const end = { by, why: run.why, nowUtcMs: clock.utcMs(), sha256 };
      await store.commit(givenUp(stored, await store.leftOpen(labId, runId), end));
    }
    this.quarantine.delete(rigId);
  }

  /** Frees a rig from a run whose end its log could not take. */
  release(rigId: string): void {
    this.quarantine.delete(rigId);
  }

  onChange(listener: SupervisorListener): () => void {
    this.listeners.add(listener);
    return () => this.listeners.delete(listener);
  }

  /** Resolves when every driver has saved and acted on all it received. */
  async idle(): Promise<void> {
    await Promise.all([...this.byRig.values()].map((driver) => driver.idle()));
  }

  /** The database does not answer since `sinceUtcMs`, or answers again (null): all runs are told. */
  noteDatabase(sinceUtcMs: number | null): void {
    for (const driver of this.byRig.values()) {
      if (sinceUtcMs === null) driver.noteDatabaseBack();
      else driver.noteDatabaseAway(sinceUtcMs);
    }
  }

  /** Lets go of the run of a rig that another process drives now. */
  letGo(rigId: string): void {
    this.byRig.get(rigId)?.close();
    this.byRig.delete(rigId);
    this.undecided.delete(rigId);
    this.quarantine.delete(rigId);
  }

  /** Lets go of all runs without touching them; the next process takes them up. */
  close(): void {
    this.closed = true;
    for (const driver of this.byRig.values()) driver.close();
    this.byRig.clear();
    this.undecided.clear();
  }

  /** Drives the run or puts it into quarantine; by and by, where the database does not answer now. */
  private async takeUp(found: StoredRun, turn = 0): Promise<void> {
    const { store, journals, clock, isPassing, onError } = this.parts;
    const { start } = found;
    const isUndecided = () => this.undecided.get(start.rigId) === found;
    if (!isUndecided()) return;
    try {
      const stored = await keptRun(found, { store, journal: journals.of(start), onAside: (error) => onError?.(error, start) });
      if (isUndecided()) this.decide(start, stored);
    } catch (error) {
      if (!isUndecided()) return;
      // A process that has lost the rig is told so, and lets go of it.
      if (isPassing(error) || error instanceof RigLostError)
        return void clock.after(Math.min(100 * 2 ** turn, LONGEST_PAUSE_MS), () => void this.takeUp(found, turn + 1));
      onError?.(error, start);
      this.putAside({ start, why: `The run could not be taken up: ${innermost(error)} ${thenEnd}`, cause: 'broken' });
    }
  }

  private decide(start: RunStart, stored: StoredRun): void {
    const unfit = this.unfitness(stored);
    if (unfit !== null) return this.putAside({ start, ...unfit });
    if (!hasEnded(stored)) this.drive(start, stored, this.parts.linkOf(start.rigId) as TurntableLink).recover();
    this.undecided.delete(start.rigId);
  }

  private putAside(run: QuarantinedRun): void {
    this.undecided.delete(run.start.rigId);
    this.quarantine.set(run.start.rigId, run);
    this.parts.onQuarantine?.(run);
  }

  /**
   * A process that has lost the rig, and does not know it yet as one that was frozen, may have written once more after this one had taken
   * the run up. This one takes it up anew, unless it is told meanwhile that it is the one that has lost it.
   */
  private lookAgain(driver: RunDriver): void {
    const { start } = driver.parts;
    if (this.byRig.get(start.rigId) !== driver) return;
    this.byRig.delete(start.rigId);
    const found = { start, snapshot: driver.state(), chartVersion: CHART_VERSION, chain: driver.head() };
    this.undecided.set(start.rigId, found);
    this.parts.clock.after(LOSS_KNOWN_MS, () => void this.takeUp(found));
  }

  /** An error that no waiting mends. */
  private broken(driver: RunDriver, error: unknown): void {
    const { start } = driver.parts;
    if (this.byRig.get(start.rigId) !== driver) return;
    this.byRig.delete(start.rigId);
    this.putAside({ start, why: `The run broke off and the turntable was held: ${innermost(error)} ${thenEnd}`, cause: 'broken' });
  }

  private unfitness({ start, chartVersion, snapshot }: StoredRun): Omit<QuarantinedRun, 'start'> | null {
    if (snapshot !== null && restored(snapshot, chartVersion) === null) {
      const versions = `${chartVersion}; this one reads ${CHART_VERSION}`;
      return { why: `The run was saved by another version of the run engine (${versions}). ${thenEnd}`, cause: 'other-version' };
    }
    if (this.parts.linkOf(start.rigId) !== null) return null;
    return { why: 'The rig has no link any more. Set one up, then start the server again.', cause: 'no-link' };
  }

  private async withItsJournal(start: RunStart): Promise<StoredRun | null> {
    const { store, journals, isPassing, onError } = this.parts;
    const found = await store.load(start.labId, start.runId);
    if (found === null) return null;
    const journal = journals.of(start);
    try {
      return await keptRun(found, { store, journal, onAside: (error) => onError?.(error, start) });
    } catch (error) {
      if (isPassing(error) || error instanceof RigLostError) throw error;
      const aside = await journal.setAside();
      onError?.(new Error(`what a journal kept of the run lies in ${aside}`, { cause: error }), start);
      return store.load(start.labId, start.runId);
    }
  }

  private drive(start: RunStart, stored: StoredRun | null, link: TurntableLink): RunDriver {
    const { store, journals, sha256, armOf, whyDisarmed, lockedBy, samplesOf, perform, onError, isPassing, serverName } = this.parts;
    const driver = new RunDriver({
      ...(serverName === undefined ? {} : { serverName }),
      ...(samplesOf === undefined ? {} : { samples: samplesOf(start.rigId) }),
      start,
      stored,
      store,
      journal: journals.of(start),
      clock: this.parts.clockOf?.(start.rigId) ?? this.parts.clock,
      sha256,
      link,
      armNow: () => armOf(start.rigId),
      whyDisarmed: () => whyDisarmed(start.rigId),
      lockedBy: () => lockedBy(start.rigId),
      perform: (effect) => perform(effect, start),
      isPassing,
      onError: (error) => onError?.(error, start),
      onBroken: (error) => this.broken(driver, error),
      onTakenOver: () => this.lookAgain(driver),
    });
    this.byRig.set(start.rigId, driver);
    driver.onChange((change) => {
      for (const listener of this.listeners) listener(driver, change);
      if (driver.isDone() && this.byRig.get(start.rigId) === driver) this.byRig.delete(start.rigId);
    });
    return driver;
  }

  private assertFree(rigId: string): void {
    const why = this.takenBy(rigId) ?? this.parts.guidedBy(rigId);
    if (why !== null) throw new StartRefused('rig-busy', why);
    const lockedBy = this.parts.lockedBy(rigId);
    if (lockedBy !== null) throw new StartRefused('locked', lockedBy);
  }

  private readyLink(rigId: string): TurntableLink {
    const link = this.parts.linkOf(rigId);
    const health = link?.health();
    const controller = link?.controller() ?? null;
    if (link === null || health === undefined)
      throw new StartRefused('not-ready', 'The rig has no link to a controller. Set one up on the rig page.');
    if (health.condition !== 'ready' || controller === null)
      throw new StartRefused('not-ready', `The link to the controller is not ready: ${health.detail || health.condition}.`);
    if (!controller.interlockClosed) throw new StartRefused('not-ready', 'The interlock is open. Close the door, then start.');
    if (!controller.supplyPresent) throw new StartRefused('not-ready', 'The motor supply is off. Switch it on at the rig, then start.');
    if (controller.moving) throw new StartRefused('not-ready', 'The turntable is moving. Wait until it stands still, then start.');
    return link;
  }

  private assertArmed(start: RunStart): void {
    if (start.simulated !== null) return;
    const { arm } = start;
    const nowUtcMs = this.parts.clock.utcMs();
    if (arm === null || arm.untilUtcMs <= nowUtcMs)
      throw new StartRefused('not-armed', 'The rig is not armed. A named person on site has to arm it first.');
    const { endUtcMs } = planTimeline(start, { utcMs: nowUtcMs, angleDeg: start.rig.motion?.homeDeg ?? 0 });
    if (arm.untilUtcMs > endUtcMs) return;
    const until = new Date(arm.untilUtcMs).toISOString();
    throw new StartRefused(
      'not-armed',
      `The arm of ${arm.name} ends at ${until}, before the predicted finish at ${new Date(endUtcMs).toISOString()}. Arm the rig until after that.`,
    );
  }
}
