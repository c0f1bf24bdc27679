import { type ChainHead, emptyChain } from '@/shared/archive/chain';
import type { ChainedEvent, StepRow } from '@/shared/archive/run-records';
import type { Instant } from '../interfaces/clock';
import { StaleRunError } from '../interfaces/run-store';
import type { LinkEvent } from '../interfaces/turntable-link';
import { chained } from './chained';
import { openMotions } from './motions';
import { beginRun, deadlineOf, isArmExpected, isRunOver, isUnderWay, wantsMotion } from './chart';
import { type Advance, CHART_VERSION, type Effect, type RunEvent, type RunSnapshot } from './run-context';
import { advanceSafely } from './advance-safely';
import { createPredictor, factsOf, plannedRun, type PlannedRun, type RunFacts, summaryOf, withDatabase } from './run-facts';
import { type Answer, readyController, type RunChange, type RunDriverParts } from './run-driver-parts';
import { RunRequests } from './run-requests';
import { lookedInto } from './look';
import { DATABASE_GRACE_MS, RunSaver } from './run-saver';
import { ALIVE_MS, RunTimers } from './run-timers';
import { LONGEST_BEAT_MS, SERVER_U_S } from './timing';
import { isOwn, type OwnEffect, snapshotIn, type StoredSnapshot } from './stored-snapshot';

type Item = { event: RunEvent; done?: (result: Advance | null) => void } | 'beat' | 'alive';

/**
 * Drives one run: takes one event at a time through the chart, saves what came of it in one transaction, then performs the
 * effects. Hold and stop go to the controller before anything else.
 */
export class RunDriver {
  readonly runId: string;
  readonly requests: RunRequests;
  private snapshot: RunSnapshot;
  private chain: ChainHead;
  private readonly inbox: Item[] = [];
  private pumping = false;
  private closed = false;
  private stale = false;
  private databaseAwaySinceUtcMs: number | null = null;
  /** Holds and stops that were acted on and are not yet through the chart: until then nothing is set in motion. */
  private halting = 0;
  private acted = 0;
  private lastBeatMs = -Infinity;
  private savedMs: number;
  private readonly timers: RunTimers;
  private readonly saver: RunSaver;
  private readonly listeners = new Set<(change: RunChange) => void>();
  private readonly waiting: (() => void)[] = [];
  private readonly predict: (snapshot: RunSnapshot, nowUtcMs: number) => number | null;
  private readonly unsubscribe: () => void;
  private planned: PlannedRun | null = null;

  constructor(readonly parts: RunDriverParts) {
    const { start, stored, clock, link, store } = parts;
    this.runId = start.runId;
    this.snapshot = stored?.snapshot == null ? beginRun(start, clock.utcMs()) : snapshotIn(stored);
    this.chain = stored?.chain ?? emptyChain;
    this.savedMs = clock.monotonicMs();
    this.predict = createPredictor(start);
    this.saver = new RunSaver({
      ...{ store, clock, journal: parts.journal },
      onAway: (sinceUtcMs) => this.databaseIsAway(sinceUtcMs),
      onBack: () => this.databaseIsBack(),
      onStale: () => this.takenOver(),
      onBroken: (error) => this.breakOff(error),
      isPassing: (error) => parts.isPassing?.(error) ?? false,
      onError: (error) => parts.onError?.(error),
    });
    this.timers = new RunTimers(clock, {
      deadline: (utcMs) => this.enqueue({ event: { type: 'deadline', at: { utcMs, uS: SERVER_U_S } } }),
      beat: () => this.enqueue('beat'),
      alive: () => this.enqueue('alive'),
    });
    this.requests = new RunRequests({
      start,
      snapshot: () => this.snapshot,
      now: () => this.now(),
      arm: () => parts.armNow(),
      lockedBy: () => this.lockedBy(),
      isOver: () => this.isOver(),
      mayNotWrite: () => this.mayNotWrite(),
      take: (event) => new Promise((done) => this.enqueue({ event, done })),
    });
    this.unsubscribe = link.subscribe((event) => this.heard(event));
    link.setLeaseRule(() => this.mayRenewLease());
  }

  /** Begins a new run: at once where the link is ready, else as soon as it is. */
  start(): void {
    this.enqueue({ event: { type: 'begin', at: this.now(), controller: readyController(this.parts.link) } });
    this.timers.keepAlive();
  }

  /** Takes up a run that another process left unfinished. */
  recover(): void {
    const { link, stored, clock, serverName = null } = this.parts;
    const { aliveUtcMs = clock.utcMs(), toPerform = [] } = (stored?.snapshot ?? {}) as Partial<StoredSnapshot>;
    for (const effect of toPerform) this.outside(() => this.parts.perform(effect));
    this.enqueue({ event: { type: 'server-restarted', at: this.now(), aliveUtcMs, serverName } });
    const open = openMotions(this.snapshot);
    link.takeUp(open);
    const controller = open.length > 0 ? null : readyController(link);
    if (controller !== null) this.heard({ kind: 'ready', at: this.now(), controller, sameBoot: true, unheard: null });
    this.timers.keepAlive();
  }

  /** Decelerates at once; saved after that. Holding a run that is held already, or a repeat of an old request (`key`), changes nothing. */
  hold(by: string, key: string | null = null): Answer {
    return this.knownAnswer(key, this.snapshot.state === 'held' && this.halting === 0) ?? this.actFirst('hold', { by, key });
  }

  /** Decelerates at once and ends the run. A repeat goes to the controller too, for nothing comes after a stop; the log has it once. */
  stop(by: string, key: string | null = null): Answer {
    return this.knownAnswer(null) ?? this.actFirst('stop', { by, key });
  }

  /** Holds when the present step has ended. */
  holdAfterDwell(by: string, key: string | null = null): Answer {
    const [known, at] = [this.knownAnswer(key), this.now()];
    if (known !== null) return known;
    if (this.snapshot.state === 'held' || this.snapshot.state === 'holding') return { ok: false, why: 'The run is held already.' };
    this.enqueue({ event: { type: 'hold-after-dwell', at, by, key } });
    return { ok: true, serverAtUtcMs: at.utcMs };
  }

  resume(by: string): Promise<Answer> {
    return this.requests.resume(by);
  }

  facts(): RunFacts {
    const { start, armNow } = this.parts;
    const nowUtcMs = this.now().utcMs;
    this.planned ??= plannedRun(start, this.snapshot.context.startedAtUtcMs ?? nowUtcMs);
    const { snapshot, planned } = this;
    const standing = { arm: armNow(), lockedBy: this.lockedBy(), lastSeq: this.chain.seq };
    const predictedEndUtcMs = this.predict(snapshot, nowUtcMs);
    return withDatabase(factsOf({ start, snapshot, nowUtcMs, ...standing, predictedEndUtcMs, planned }), this.databaseAwaySinceUtcMs);
  }

  /** The database does not answer, as the keeper of the rig lease noticed: also a run that has nothing to write is interrupted. */
  noteDatabaseAway(sinceUtcMs: number): void {
    if (!this.closed && !this.isOver()) this.saver.noteAway(sinceUtcMs);
  }

  noteDatabaseBack(): void {
    if (!this.closed) this.saver.noteBack();
  }

  /** Whether the run is over and all of it is in the database. */
  isDone(): boolean {
    return this.stale || (isRunOver(this.snapshot) && !this.saver.journalling);
  }

  /** Where the run stands, as last saved. */
  state(): RunSnapshot {
    return this.snapshot;
  }

  /** End of the event chain as last saved. */
  head(): ChainHead {
    return this.chain;
  }

  isOver(): boolean {
    return this.stale || isRunOver(this.snapshot);
  }

  onChange(listener: (change: RunChange) => void): () => void {
    this.listeners.add(listener);
    return () => this.listeners.delete(listener);
  }

  /** Resolves when every event received so far is saved and acted on. */
  idle(): Promise<void> {
    if (!this.pumping && this.inbox.length === 0) return Promise.resolve();
    return new Promise((resolve) => this.waiting.push(resolve));
  }

  /** Lets go of the run without touching it: nothing more is sent or saved, and the lease runs out. */
  close(): void {
    this.closed = true;
    this.saver.close();
    this.unsubscribe();
    this.parts.link.setLeaseRule(() => false);
    this.timers.close();
    for (const item of this.inbox.splice(0)) if (typeof item !== 'string') item.done?.(null);
  }

  /** Where nothing is to be done any more: the run is over, or this was done before. */
  private knownAnswer(key: string | null, isDone = false): Answer | null {
    if (this.isOver()) return { ok: false, why: 'The run is over.' };
    const isRepeat = key !== null && this.snapshot.context.actedOn?.includes(key) === true;
    return isDone || isRepeat ? { ok: true, serverAtUtcMs: this.now().utcMs } : null;
  }

  private actFirst(kind: 'hold' | 'stop', asked: { by: string; key: string | null }): Answer {
    const at = this.now();
    const id = this.actedId(kind, at.utcMs);
    this.halting += 1;
    const releaseDrivers = this.parts.start.rig.motion?.safeWhenFree === true;
    const kept = new Promise((done) => {
      // What the link tells while it sends comes after the hold, and is taken up after it.
      this.inbox.push({ event: { type: kind, at, ...asked, acted: id }, done });
      this.parts.link.send(kind === 'hold' ? { kind, id } : { kind, id, releaseDrivers });
    });
    this.saver.hurryUp();
    this.kick();
    return { ok: true, serverAtUtcMs: at.utcMs, kept };
  }

  /** Of a command that goes out before anything is saved. */
  private actedId(kind: string, utcMs: number): string {
    this.acted += 1;
    return `${this.runId}-${kind}-${Math.round(utcMs)}-${this.acted}`;
  }

  private heard(link: LinkEvent): void {
    if (this.closed || link.kind === 'accepted') return;
    this.enqueue({ event: { type: `link.${link.kind}`, at: this.now(), link } as RunEvent });
  }

  private now(): Instant {
    return { utcMs: this.parts.clock.utcMs(), uS: SERVER_U_S };
  }

  private enqueue(item: Item): void {
    if (this.closed) return;
    this.inbox.push(item);
    this.kick();
  }

  private kick(): void {
    if (!this.pumping) void this.pump();
  }

  private async pump(): Promise<void> {
    this.pumping = true;
    try {
      for (let item = this.inbox.shift(); item !== undefined && !this.closed; item = this.inbox.shift()) {
        if (item === 'beat') this.beat();
        else if (item === 'alive') await this.saveAlive();
        else await this.take(item);
        this.noticeEndOfArm();
      }
    } catch (error) {
      this.breakOff(error);
    }
    this.pumping = false;
    for (const resolve of this.waiting.splice(0)) resolve();
  }

  /** What the loop cannot deal with: motion ends, and somebody decides. The next process takes the run up from what was saved. */
  private breakOff(error: unknown): void {
    this.stale = true;
    this.outside(() => this.parts.link.send({ kind: 'hold', id: `${this.runId}-broken` }));
    this.close();
    this.parts.onError?.(error);
    this.parts.onBroken?.(error);
  }

  private async take({ event, done }: Exclude<Item, string>): Promise<void> {
    const result = advanceSafely(this.parts.start, this.snapshot, event);
    const halted = event.type === 'hold' || event.type === 'stop';
    if (result.snapshot.context !== this.snapshot.context || result.snapshot.state !== this.snapshot.state)
      await this.saveThenAct(result, halted).catch((error: unknown) => {
        done?.(null);
        throw error;
      });
    else if (halted) this.halting -= 1;
    done?.(this.stale || this.closed ? null : result);
  }

  private async saveThenAct(result: Advance, halted: boolean): Promise<void> {
    const events = chained(result.events, this.chain, this.parts.sha256);
    const hurried = this.halting > 0;
    const saved = await this.save(result.snapshot, { steps: result.steps, events, toPerform: result.effects.filter(isOwn), hurried });
    if (halted) this.halting -= 1;
    if (!saved) return;
    this.snapshot = result.snapshot;
    this.chain = events.at(-1) ?? this.chain;
    for (const effect of result.effects) this.performEffect(effect);
    this.beat();
    this.timers.awaitDeadline(deadlineOf(this.snapshot));
    this.tell({ facts: this.facts(), steps: result.steps, events });
    if (isRunOver(this.snapshot)) this.finish();
  }

  private async save(
    snapshot: RunSnapshot,
    { toPerform, hurried, ...changed }: { steps: StepRow[]; events: ChainedEvent[]; toPerform: OwnEffect[]; hurried: boolean },
  ): Promise<boolean> {
    const { start, clock } = this.parts;
    const stored: StoredSnapshot = { ...snapshot, aliveUtcMs: clock.utcMs(), toPerform };
    const summary = summaryOf(snapshot, this.predict(snapshot, clock.utcMs()));
    try {
      const { labId, runId } = start;
      const write = { labId, runId, expectedSeq: this.chain.seq, snapshot: stored, chartVersion: CHART_VERSION, ...changed, summary };
      const saved = await this.saver.save(write, { hurried });
      this.savedMs = clock.monotonicMs();
      return saved && !this.closed;
    } catch (error) {
      if (!(error instanceof StaleRunError)) throw error;
      this.takenOver();
      return false;
    }
  }

  /** Another process has driven the run on: not a word more to the controller. */
  private takenOver(): void {
    this.stale = true;
    this.close();
    this.parts.onTakenOver?.();
  }

  private performEffect(effect: Effect): void {
    // Answered at once, before what waits: the chart decides with what is known now.
    if (effect.kind === 'look') return void this.inbox.unshift({ event: lookedInto(this.parts, effect.look, this.now()) });
    if (effect.kind !== 'link') return this.outside(() => this.parts.perform(effect));
    const { command } = effect;
    const startsMotion = command.kind !== 'hold' && command.kind !== 'stop';
    if (startsMotion && this.mayNotMove()) return;
    if (startsMotion) this.lastBeatMs = this.parts.clock.monotonicMs();
    this.parts.link.send(command);
  }

  /** A hold or stop is under way, the database is away, hands are in the rig, or it is armed no more: nothing is set in motion. */
  private mayNotMove(): boolean {
    return this.halting > 0 || this.mayNotWrite() || this.lockedBy() !== null || this.isDisarmed();
  }

  private mayNotWrite(): boolean {
    return this.databaseAwaySinceUtcMs !== null || this.saver.journalling;
  }

  private lockedBy(): string | null {
    return this.parts.lockedBy?.() ?? null;
  }

  private isDisarmed(): boolean {
    return this.parts.armNow() === null && isArmExpected(this.parts.start, this.snapshot, this.now().utcMs);
  }

  private noticeEndOfArm(): void {
    if (this.closed || !isUnderWay(this.snapshot) || !this.isDisarmed()) return;
    if (this.inbox.some((item) => typeof item !== 'string' && item.event.type === 'arm-ended')) return;
    this.inbox.push({ event: { type: 'arm-ended', at: this.now(), why: this.parts.whyDisarmed?.() ?? '' } });
  }

  /** Motion ends at once; what the protocol makes of it is decided before all that waits. */
  private databaseIsAway(sinceUtcMs: number): void {
    if (this.closed) return;
    this.databaseAwaySinceUtcMs = sinceUtcMs;
    if (isRunOver(this.snapshot)) return;
    const acted = wantsMotion(this.snapshot) ? this.actedId('away', sinceUtcMs) : null;
    if (acted !== null) this.parts.link.send({ kind: 'hold', id: acted });
    this.inbox.unshift({ event: { type: 'database-away', at: this.now(), sinceUtcMs, acted } });
    this.kick();
  }

  private databaseIsBack(): void {
    this.databaseAwaySinceUtcMs = null;
    if (isRunOver(this.snapshot)) return this.tell({ facts: this.facts(), steps: [], events: [] });
    this.enqueue({ event: { type: 'database-back', at: this.now() } });
  }

  /** Granted only while the loop turns, in a state that wants motion; a short outage of the database is bridged. */
  private mayRenewLease(): boolean {
    if (this.closed || this.mayNotMove() || !wantsMotion(this.snapshot)) return false;
    const nowMs = this.parts.clock.monotonicMs();
    const { busySinceMs } = this.saver;
    if (busySinceMs !== null) return nowMs - busySinceMs <= DATABASE_GRACE_MS;
    return nowMs - this.lastBeatMs <= LONGEST_BEAT_MS;
  }

  private beat(): void {
    this.lastBeatMs = this.parts.clock.monotonicMs();
    if (wantsMotion(this.snapshot)) this.timers.awaitBeat();
  }

  /** So that a restart knows how long nobody drove the run. */
  private async saveAlive(): Promise<void> {
    if (this.isOver() || this.mayNotWrite() || this.parts.clock.monotonicMs() - this.savedMs < ALIVE_MS / 2) return;
    await this.save(this.snapshot, { steps: [], events: [], toPerform: [], hurried: false });
  }

  private finish(): void {
    this.unsubscribe();
    this.parts.link.setLeaseRule(() => false);
    this.timers.close();
  }

  /** Others' errors are theirs: the run goes on. */
  private outside(call: () => void): void {
    try {
      call();
    } catch (error) {
      this.parts.onError?.(error);
    }
  }

  private tell(change: RunChange): void {
    for (const listener of this.listeners) this.outside(() => listener(change));
  }
}
