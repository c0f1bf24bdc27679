import { decodeLine } from '@/firmware-protocol/codec';
import type { RunStart } from '@/shared/archive/run-records';
import { motionOf } from '@/shared/protocol/durations';
import { MemoryJournals } from '@/server/engine/memory-journal';
import { RigSupervisor, type SupervisorParts } from '@/server/engine/rig-supervisor';
import type { Arm } from '@/server/engine/run-context';
import type { RunDriver } from '@/server/engine/run-driver';
import { SteadyClock } from '@/server/engine/steady-clock';
import { VirtualClock } from '@/server/engine/virtual-clock';
import { sha256Hex } from '@/server/evaluation/sha256';
import type { Clock } from '@/server/interfaces/clock';
import type { LinkEvent, TurntableLink } from '@/server/interfaces/turntable-link';
import { isPassing } from '@/server/store/failures';
import { createLink } from '@/server/links/link-driver';
import { createSimulatedController, type SimulatedController } from '@/server/links/simulated-controller';
import { ArmedRig } from './armed-rig';
import { Room } from './room';
import { SimulatedStore } from './simulated-store';

/** The engine, link and codec of a server with a turntable, a database and a disk around them, which can all fail. */

const settle = async () => {
  for (let turn = 0; turn < 12; turn += 1) await null;
};

/** The clocks of the server's machine: the wall clock may be set, and run at another rate than durations are measured by. */
class SteppingClock implements Clock {
  stepMs = 0;
  ratePpm = 0;
  constructor(private readonly clock: VirtualClock) {}
  monotonicMs = () => this.clock.monotonicMs();
  utcMs = () => this.clock.utcMs() + this.stepMs + this.ratePpm * 1e-6 * this.monotonicMs();
  after = (delayMs: number, task: () => void) => this.clock.after(delayMs, task);
}

/** Most lines ask or tell something else; those need not be read. */
const ordersMotion = / (home|move|nudge) /;

/** What a night left behind, for the checkers; times are true ones, ms since the beginning. */
export interface Witness {
  /** Motions that the controller began. */
  began: { tag: string; atMs: number }[];
  /** Orders of motion, at their first arrival at the controller. */
  ordered: { tag: string; atMs: number }[];
  /** Holds and stops that people were answered. */
  halts: { kind: 'hold' | 'stop'; atMs: number }[];
  /** Resumes and confirmed prompts of people who were at the rig and armed it again. */
  resumes: number[];
  /** Resumes that came to a server over a network; `acted`: it let the run decide; `setMs`: by how much its clock was set since the tap. */
  resumesFromAfar: { by: string; atMs: number; ageMs: number; setMs: number; acted: boolean }[];
  /** Holds and stops from afar that a server acted on and answered. */
  acknowledged: { act: 'hold' | 'stop'; by: string }[];
  /** A page said that the controller had confirmed the stop, and where the table stood then. */
  stoppedSaid: { atMs: number; angleDeg: number }[];
  hazards: { kind: string; atMs: number }[];
  /** Events of the log that somebody was told. */
  told: Map<number, string>;
  errors: unknown[];
}

/** Who answers for the rig, and whose hands are in it, as one process has it. */
export interface Rights {
  parts: Pick<SupervisorParts, 'armOf' | 'whyDisarmed' | 'lockedBy' | 'guidedBy' | 'perform'>;
  /** It is read before the line is opened; null: there is nothing to read. */
  loaded: Promise<void> | null;
  heard(event: LinkEvent): void;
  close(): void;
}

export class World {
  readonly clock: VirtualClock;
  readonly machineClock: SteppingClock;
  readonly store: SimulatedStore;
  readonly controller: SimulatedController;
  readonly room: Room;
  readonly witness: Witness = {
    ...{ began: [], ordered: [], halts: [], hazards: [], told: new Map(), errors: [] },
    ...{ resumes: [], resumesFromAfar: [], acknowledged: [], stoppedSaid: [] },
  };
  private readonly journals = new MemoryJournals();
  /** People who arm the rig, and lay hands into it; null where an arm is but a word of whoever resumes. */
  readonly rig: ArmedRig | null;
  private arm: Arm | null;
  private rights: Rights | null = null;
  private link: TurntableLink | null = null;
  private supervisor: RigSupervisor | null = null;
  private last: RunDriver | null = null;
  /** Driver of the present process; null while it has not taken the run up. */
  present: RunDriver | null = null;
  /** Number of the process, which is its epoch too. */
  process = 0;
  /** State of the run as the next process found it, which had nothing to take up. */
  private endedBefore: string | null = null;
  /** Sends of the present process, counted down to its death; below 0: it lives. */
  private dieAtSend = -1;

  constructor(
    private start: RunStart,
    { seed, startUtcMs, isArmed = false }: { seed: number; startUtcMs: number; isArmed?: boolean },
  ) {
    this.clock = new VirtualClock(startUtcMs, settle);
    this.machineClock = new SteppingClock(this.clock);
    this.store = new SimulatedStore(start);
    this.room = new Room(this.machineClock);
    this.arm = start.arm;
    this.controller = createSimulatedController({
      ...{ clock: this.clock, rig: motionOf(start.rig), seed },
      tap: { arrived: (line) => this.noteArrived(line), sent: (line) => this.noteSent(line) },
    });
    this.rig = isArmed ? new ArmedRig(this, { seed, start }) : null;
  }

  get nowMs(): number {
    return this.clock.monotonicMs();
  }

  /** The driver of the run, or the last one that there was. */
  get driver(): RunDriver {
    if (this.last === null) throw new Error('the night has not begun');
    return this.last;
  }

  /** Where the run stands; of one that had ended when its driver died, as the database has it. */
  get state(): string {
    return this.endedBefore ?? this.driver.state().state;
  }

  get over(): boolean {
    return this.hadEnded || this.driver.isOver();
  }

  get done(): boolean {
    return this.hadEnded || this.driver.isDone();
  }

  private get hadEnded(): boolean {
    return this.endedBefore !== null && ['finished', 'stopped', 'failed'].includes(this.endedBefore);
  }

  get alive(): boolean {
    return this.supervisor !== null;
  }

  async begin(): Promise<void> {
    const supervisor = this.openServer();
    await this.clock.advance(3_000);
    if (this.rig === null) this.follow(supervisor.startRun(this.start));
    else await this.rig.begin((arm) => this.startRun(supervisor, arm));
  }

  /** @throws StartRefused */
  private startRun(supervisor: RigSupervisor, arm: Arm | null): void {
    this.start = this.store.start = { ...this.start, arm: arm === null ? null : { name: arm.name, untilUtcMs: arm.untilUtcMs } };
    this.follow(supervisor.startRun(this.start));
  }

  /** As SIGKILL would: nothing more is said or saved. */
  kill(): void {
    this.supervisor?.close();
    this.rights?.close();
    void this.link?.close();
    this.supervisor = null;
    this.present = null;
    this.link = null;
    this.dieAtSend = -1;
  }

  /** Dies just before the n-th command that it gives to the controller from now. */
  killAtSend(n: number): void {
    if (this.alive) this.dieAtSend = n;
  }

  /** What was to come and has not come yet does not come any more. */
  heal(): void {
    this.store.away = false;
    this.store.loseAnswers = 0;
    this.store.onCommit = () => undefined;
    this.dieAtSend = -1;
  }

  /** The next process, as soon as it finds the database. */
  async comeBack(): Promise<void> {
    if (this.alive || this.store.away) return;
    const supervisor = this.openServer();
    const { rigId } = this.start;
    try {
      if (this.rights?.loaded != null) await this.rights.loaded;
    } catch {
      // As systemd would, somebody starts it again.
      return this.supervisor === supervisor ? this.kill() : undefined;
    }
    await supervisor.recover();
    // The database may have gone away again at that very moment.
    while (supervisor.activeOf(rigId) === null && supervisor.takenBy(rigId) !== null)
      await new Promise<void>((resolve) => void this.clock.after(20, resolve));
    const taken = supervisor.activeOf(rigId);
    if (taken !== null) this.follow(taken);
    else if (this.supervisor === supervisor) this.endedBefore = this.store.state();
  }

  /** A person asks; it counts from the moment at which it was answered. */
  halt(kind: 'hold' | 'stop'): void {
    if (!this.alive || this.hadEnded) return;
    const answer = this.driver[kind]('Ben');
    if (!answer.ok) return;
    const { process } = this;
    const answered = () => this.process === process && this.alive && this.witness.halts.push({ kind, atMs: this.nowMs });
    if (answer.kept === undefined) answered();
    else void answer.kept.then((result) => result !== null && answered());
  }

  /** Somebody has been at the rig and armed it again, then resumes; of a rig with people somebody resumes, and it stands as they left it. */
  resume(): void {
    if (!this.alive) return;
    this.arm = this.start.arm;
    this.witness.resumes.push(this.nowMs);
    void this.driver.resume('Ben');
  }

  /** Somebody has been at the rig, armed it again and confirms the prompt that waits: from then on motion is meant, as after a resume. */
  confirm(): void {
    if (!this.alive) return;
    const before = this.arm;
    this.arm = this.start.arm;
    const atMs = this.nowMs;
    if (this.driver.facts().waiting?.mayConfirm.ok !== true) {
      this.arm = before;
      return;
    }
    this.witness.resumes.push(atMs);
    void this.driver.requests.confirmPrompt('Ben');
  }

  hazard(kind: 'reset' | 'interlock' | 'supply', lastsMs: number): void {
    const { controller, clock } = this;
    this.witness.hazards.push({ kind, atMs: this.nowMs });
    if (kind === 'reset') return controller.reset('watchdog');
    if (kind === 'interlock') controller.openInterlock();
    else controller.loseSupply();
    clock.after(lastsMs, () => (kind === 'interlock' ? controller.closeInterlock() : controller.returnSupply()));
  }

  angleDeg(): number {
    return this.controller.trueAngleDegAt(this.clock.utcMs());
  }

  private openServer(): RigSupervisor {
    this.process += 1;
    const clock = new SteadyClock(this.machineClock, () => this.supervisor?.drives(this.start.rigId) ?? false);
    const link = createLink({
      factory: this.controller.factory,
      clock,
      rig: motionOf(this.start.rig),
      epoch: this.process,
    });
    this.link = link;
    const send = link.send.bind(link);
    link.send = (command) => {
      if (this.link !== link) return;
      if (this.dieAtSend === 0) return this.kill();
      if (this.dieAtSend > 0) this.dieAtSend -= 1;
      send(command);
    };
    const rights = this.rig?.rights({ link, supervisor: () => this.supervisor }) ?? this.wordOfMouth();
    this.rights = rights;
    link.subscribe(rights.heard);
    if (rights.loaded === null) link.open();
    else
      rights.loaded.then(
        () => this.link === link && link.open(),
        () => undefined,
      );
    this.supervisor = new RigSupervisor({
      ...{ store: this.store, journals: this.journals, clock, sha256: sha256Hex },
      isPassing,
      linkOf: () => link,
      samplesOf: () => this.room.reader,
      onError: (error) => this.witness.errors.push(error),
      ...rights.parts,
    });
    return this.supervisor;
  }

  private wordOfMouth(): Rights {
    return {
      parts: {
        armOf: () => this.arm,
        guidedBy: () => null,
        whyDisarmed: () => 'it was ended',
        lockedBy: () => null,
        perform: (effect) => {
          if (effect.kind === 'void-arm') this.arm = null;
        },
      },
      loaded: null,
      heard: () => undefined,
      close: () => undefined,
    };
  }

  private follow(driver: RunDriver): void {
    this.last = driver;
    this.present = driver;
    driver.onChange(({ events, steps }) => {
      this.rig?.noteSteps(steps);
      for (const { seq, hash } of events) this.witness.told.set(seq, hash);
    });
  }

  private noteArrived(line: string): void {
    if (!ordersMotion.test(line)) return;
    const item = decodeLine(line);
    if (item.kind !== 'request' || !('tag' in item.order)) return;
    const { tag } = item.order;
    if (!this.witness.ordered.some((order) => order.tag === tag)) this.witness.ordered.push({ tag, atMs: this.nowMs });
  }

  private readonly seen = new Set<string>();

  private noteSent(line: string): void {
    if (!line.includes(' began ')) return;
    const item = decodeLine(line.trimEnd());
    if (item.kind !== 'event') return;
    // An event that is read again, as by the next process, is the same event; numbers and times begin anew with each reset.
    const resets = this.witness.hazards.filter(({ kind }) => kind === 'reset').length;
    const key = `${resets} ${item.number} ${item.atUs}`;
    if (this.seen.has(key)) return;
    this.seen.add(key);
    if (item.what.word === 'began') this.witness.began.push({ tag: item.what.tag, atMs: this.nowMs });
  }
}
