import pino from 'pino';
import type { RunStart, StepRow } from '@/shared/archive/run-records';
import { Background } from '@/server/boot/background';
import { buildStanding, type Standing } from '@/server/boot/build-standing';
import { heedLinks, performing } from '@/server/boot/heed-links';
import { GuidedMoves } from '@/server/engine/guided-moves';
import { KeyTurns } from '@/server/engine/key-turns';
import { MotorSoak } from '@/server/engine/motor-soak';
import { StartRefused, type RigSupervisor } from '@/server/engine/rig-supervisor';
import type { Arm } from '@/server/engine/run-context';
import { assertMayArm } from '@/server/http/routes/arming';
import type { PersonalLock } from '@/server/interfaces/lock-keeper';
import type { TurntableLink } from '@/server/interfaces/turntable-link';
import { SimulatedStanding } from './simulated-standing';
import { databaseAway } from './simulated-store';
import { Visitors } from './visitors';
import type { Rights, World } from './world';

/** Of a night, so that it need not be long. */
export const exitDelayMs = 20_000;
const START_PATIENCE_MS = 200_000;
const LOOK_MS = 500;
const log = pino({ level: 'silent' });

/** What truly happened at the rig, for the checkers; times are true ones, ms since the beginning. */
export interface RigWitness {
  /** The door, the supply and the key, whoever knew of it; `reset`: the controller restarted. */
  changes: { what: 'door' | 'supply' | 'key' | 'reset'; on: boolean; atMs: number }[];
  /** Armings that a server began to wait for. */
  asked: { atMs: number; untilUtcMs: number }[];
  /** A person ended the arm, and was answered. */
  ended: { atMs: number }[];
  /** A prompt let people in. */
  prompts: { atMs: number }[];
  /** Personal locks that were answered; `liftedMs`: when it was answered that it is lifted. */
  locks: { id: string; setMs: number; atMs: number; liftedMs: number | null }[];
  /** The start of the night. */
  start: { dueMs: number; beganMs: number | null; why: string } | null;
}

interface Process extends Standing {
  link: TurntableLink;
  keyTurns: KeyTurns;
  supervisor(): RigSupervisor | null;
  isAlive(): boolean;
}

/** The rig as people meet it: its key and its door, arming, personal locks, and the start of the night. What a server makes of them is the product's own. */
export class ArmedRig {
  readonly witness: RigWitness = { changes: [], asked: [], ended: [], prompts: [], locks: [], start: null };
  readonly kept: SimulatedStanding;
  readonly visitors: Visitors;
  private readonly rig: { labId: string; rigId: string; rigName: string };
  private process: Process | null = null;
  private ids = 0;

  constructor(
    private readonly world: World,
    { seed, start: { labId, rigId, rigName } }: { seed: number; start: RunStart },
  ) {
    this.rig = { labId, rigId, rigName };
    this.kept = new SimulatedStanding(world.store);
    this.visitors = new Visitors(world, this, seed);
    this.watch();
  }

  /** What one process knows and does; from now on it is the one that answers people. */
  rights({ link, supervisor }: { link: TurntableLink; supervisor(): RigSupervisor | null }): Rights {
    const { world, rig } = this;
    const { rigId } = rig;
    const isAlive = () => this.process === process && world.alive;
    const guided: GuidedMoves = new GuidedMoves({
      ...{ clock: world.machineClock, linkOf: () => link, onChange: () => undefined },
      armOf: () => standing.arms.armOf(rigId),
      takenBy: () => supervisor()?.takenBy(rigId) ?? null,
      lockedBy: () => standing.locks.lockedBy(rigId),
      endArm: (of, why, by) => standing.arms.end(of, why, by),
    });
    const standing: Standing = buildStanding({
      ...{ store: this.kept.of(isAlive), standing: this.kept.disk },
      ...{ clock: world.machineClock, log, background: new Background(log), onLine: () => undefined, linkOf: () => link },
      newId: () => `lock ${(this.ids += 1)}`,
      exitDelayMsOf: () => exitDelayMs,
      supervisor: () => supervisor() as RigSupervisor,
      guided: () => guided,
    });
    const keyTurns = new KeyTurns(world.machineClock);
    const process: Process = { ...standing, link, keyTurns, supervisor, isAlive };
    const heed = heedLinks(
      { ...standing, guided, keyTurns, soak: new MotorSoak() },
      { log, nowUtcMs: () => world.machineClock.utcMs(), onLinkEvent: () => undefined },
    );
    this.process = process;
    return {
      parts: {
        armOf: () => standing.arms.armOf(rigId),
        whyDisarmed: () => standing.arms.endedOf(rigId)?.why ?? '',
        lockedBy: () => standing.locks.lockedBy(rigId),
        guidedBy: () => guided.takenBy(rigId),
        perform: performing(standing.arms, () => undefined),
      },
      loaded: Promise.all([standing.arms.load(rig), standing.locks.load(rig)]).then(() => undefined),
      heard: (event) => heed({ ...rig, link }, event),
      close: () => {
        standing.arms.close();
        standing.locks.close();
        standing.arming.close();
        if (this.process === process) this.process = null;
      },
    };
  }

  /** The first visitor arms the rig; the run is to start at its instant, or as soon as it is armed. */
  async begin(start: (arm: Arm | null) => void): Promise<void> {
    const { world, visitors, witness } = this;
    const dueMs = visitors.first();
    const attempt = (): string => {
      try {
        start(this.process?.arms.armOf(this.rig.rigId) ?? null);
        return '';
      } catch (error) {
        if (!(error instanceof StartRefused)) throw error;
        return error.message;
      }
    };
    await world.clock.advance(dueMs - world.nowMs);
    let why = attempt();
    witness.start = { dueMs, beganMs: why === '' ? world.nowMs : null, why };
    for (let leftMs = START_PATIENCE_MS; why !== '' && leftMs > 0; leftMs -= LOOK_MS) {
      await world.clock.advance(LOOK_MS);
      if (leftMs % 60_000 === 0) visitors.armsForTheNight();
      why = attempt();
    }
    if (why !== '') throw new Error(`the night did not begin: ${why}`);
  }

  noteSteps(steps: readonly StepRow[]): void {
    const { prompts } = this.witness;
    if (steps.some(({ kind, outcome }) => kind === 'prompt' && outcome === null)) prompts.push({ atMs: this.world.nowMs });
  }

  /** Asks the server to arm; true where it waits for the key now. */
  asksToArm(by: { id: string; name: string }, untilUtcMs: number): boolean {
    return this.answered((process) => {
      const { rigId, rigName } = this.rig;
      const { locks, supervisor, link } = process;
      assertMayArm({ locks, supervisor: supervisor() as RigSupervisor, stations: { get: () => ({ link }) } }, { id: rigId, name: rigName });
      process.arms.end(this.rig, 'it is armed anew', by);
      process.arming.begin({ ...this.rig, ...{ name: by.name, note: '', untilUtcMs, by } });
      this.witness.asked.push({ atMs: this.world.nowMs, untilUtcMs });
    });
  }

  disarms(by: { id: string; name: string }): void {
    const { rigId } = this.rig;
    const isAnswered = this.answered(({ arming, arms }) => {
      if (arming.of(rigId) !== null) arming.end(rigId, `${by.name} ended it before the exit delay was over`);
      else arms.end(this.rig, `disarmed by ${by.name}`, by);
    });
    if (isAnswered) this.witness.ended.push({ atMs: this.world.nowMs });
  }

  /** The lock, where the server said that it is set. */
  setsLock({ id: userId, name }: { id: string; name: string }): PersonalLock | null {
    let lock: PersonalLock | null = null;
    const isAnswered = this.answered(({ locks }) => {
      const setUtcMs = this.world.machineClock.utcMs();
      lock = locks.set({ labId: this.rig.labId, rigId: this.rig.rigId, userId, name, note: '', setUtcMs });
    });
    const set = lock as PersonalLock | null;
    if (!isAnswered || set === null) return null;
    const { locks } = this.witness;
    const atMs = this.world.nowMs;
    if (!locks.some(({ id }) => id === set.id)) locks.push({ id: set.id, setMs: atMs, atMs, liftedMs: null });
    return set;
  }

  /** Whoever set it turns the key and lifts it; true where it is lifted. */
  async liftsLock({ id, userId }: PersonalLock): Promise<boolean> {
    const { process, world } = this;
    const { rigId } = this.rig;
    const lock = process?.locks.locksOf(rigId).find((one) => one.userId === userId);
    if (process === null || lock === undefined || world.store.away) return false;
    const turn = process.keyTurns.take(rigId, lock.setUtcMs);
    if (turn === null) return false;
    try {
      await this.kept.lift(lock);
    } catch {
      process.keyTurns.giveBack(rigId, turn);
      // It may be lifted all the same: whoever asks again finds out.
      const gone = !this.kept.locks.some((one) => one.id === id);
      if (gone) this.noteLifted(id);
      return false;
    }
    this.noteLifted(id);
    process.locks.lifted(rigId, lock.id);
    return true;
  }

  private noteLifted(id: string): void {
    const noted = this.witness.locks.find((one) => one.id === id);
    if (noted !== undefined) noted.liftedMs ??= this.world.nowMs;
  }

  /** As a route: its key lies in the database before anything is done, and what it came to is stored before it is answered. */
  private answered(deed: (process: Process) => void): boolean {
    const { process, world } = this;
    if (process === null || !process.isAlive() || world.store.away) return false;
    try {
      deed(process);
    } catch {
      return false;
    }
    if (world.store.away) throw databaseAway();
    return process.isAlive();
  }

  /** Whatever is done to the rig is seen, by whoever it is done. */
  private watch(): void {
    const { world, witness } = this;
    const { openInterlock, closeInterlock, loseSupply, returnSupply, turnArmKey, reset } = world.controller;
    const note = (what: RigWitness['changes'][0]['what'], on: boolean) => {
      const last = witness.changes.findLast((change) => change.what === what);
      if (what === 'reset' || (last?.on ?? what !== 'key') !== on) witness.changes.push({ what, on, atMs: world.nowMs });
    };
    const seen =
      <A extends unknown[]>(deed: (...args: A) => void, noted: (...args: A) => void) =>
      (...args: A) => {
        noted(...args);
        deed(...args);
      };
    Object.assign(world.controller, {
      openInterlock: seen(openInterlock, () => note('door', false)),
      closeInterlock: seen(closeInterlock, () => note('door', true)),
      loseSupply: seen(loseSupply, () => note('supply', false)),
      returnSupply: seen(returnSupply, () => note('supply', true)),
      turnArmKey: seen(turnArmKey, (on) => note('key', on)),
      reset: seen(reset, () => note('reset', true)),
    });
  }
}
