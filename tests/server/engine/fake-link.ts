import type { Clock, Instant } from '@/server/interfaces/clock';
import type {
  ControllerLimits,
  ControllerState,
  LinkCommand,
  LinkEvent,
  LinkHealth,
  MotionEndCause,
  MotionSent,
  TeachOutcome,
  TurntableLink,
} from '@/server/interfaces/turntable-link';
import { trapezoid } from '@/shared/physics/trapezoid';

interface Going {
  id: string;
  fromDeg: number;
  toDeg: number;
  beganUtcMs: number;
  timeline: (tS: number) => number;
  cancel: () => void;
}

/**
 * A turntable of a few lines: it obeys on the clock, brakes on the spot, and records all that it was told. Faults are
 * raised by hand. The real link and its simulated controller are tested with the engine in tests/simulation.
 */
export class FakeLink implements TurntableLink {
  readonly commands: LinkCommand[] = [];
  /** `unheard`: no command could reach the turntable when it began. */
  readonly motions: { commandId: string; beganUtcMs: number; unheard: boolean }[] = [];
  bootId = 'boot-1';
  up = true;
  angleDeg: number | null = 0;
  interlockClosed = true;
  supplyPresent = true;
  warningDue = false;
  refuseNext: { code: string; message: string } | null = null;
  /** Events of these kinds are lost for good: they left the controller's ring before they could be read again. */
  loses: LinkEvent['kind'][] = [];
  /** Swallow commands without a word. */
  deaf = false;
  mayRenew: () => boolean = () => false;
  private going: Going | null = null;
  private waiting: { id: string; cancel: () => void } | null = null;
  private readonly listeners = new Set<(event: LinkEvent) => void>();
  private readonly unsaid: LinkEvent[] = [];
  private readonly unconfirmed: Extract<LinkCommand, { kind: 'hold' | 'stop' }>[] = [];
  /** What happened to commands, as the controller's ring keeps it. */
  private readonly ring: Extract<LinkEvent, { commandId: string }>[] = [];

  constructor(private readonly clock: Clock) {}

  open(): void {}

  async close(): Promise<void> {}

  health(): LinkHealth {
    return {
      condition: this.up ? 'ready' : 'lost',
      detail: '',
      lastReplyUtcMs: null,
      roundTripMs: 2,
      roundTripP50Ms: 2,
      roundTripP95Ms: 2,
      discardedLines: 0,
      discardedBytes: 0,
      droppedByController: 0,
      retries: 0,
      reconnects: 0,
      clockOffsetMs: 0,
      clockUS: 0.0002,
      driftPpm: 0,
      driftUPpm: 1,
      bootId: this.bootId,
      firmware: 'fake',
      protocol: '1.0',
      higherEpoch: null,
    };
  }

  controller(): ControllerState {
    return {
      bootId: this.bootId,
      firmware: 'fake',
      positionKnown: this.angleDeg !== null,
      angleDeg: this.angleDeg,
      moving: this.going !== null,
      interlockClosed: this.interlockClosed,
      supplyPresent: this.supplyPresent,
      armKey: true,
      driversOn: true,
      homeFlagCovered: false,
      leaseLive: false,
      warningDue: this.warningDue,
    };
  }

  limits(): ControllerLimits | null {
    return null;
  }

  raiseEpoch(): void {}

  async teach(limits: ControllerLimits): Promise<TeachOutcome> {
    return { taught: true, limits };
  }

  setLeaseRule(mayRenew: () => boolean): void {
    this.mayRenew = mayRenew;
  }

  takeUp(motions: readonly MotionSent[]): void {
    if (motions.length === 0 || !this.up) return;
    const ids = new Set(motions.map(({ id }) => id));
    this.clock.after(5, () => {
      for (const event of this.ring) if (ids.has(event.commandId)) this.tell(event);
      this.tell({ kind: 'ready', at: this.at(), controller: this.controller(), sameBoot: true, unheard: null });
    });
  }

  subscribe(listener: (event: LinkEvent) => void): () => void {
    this.listeners.add(listener);
    return () => this.listeners.delete(listener);
  }

  send(command: LinkCommand): void {
    this.commands.push(command);
    if (this.deaf) return;
    if (command.kind === 'hold' || command.kind === 'stop') return this.halt(command);
    if (!this.up || command.kind === 'nudge') return;
    this.clock.after(5, () => this.obey(command));
  }

  /** The line goes dead: the controller ends motion by itself 2 s later, and 5 s of silence later the link says so. */
  drop(forMs: number): void {
    this.up = false;
    this.clock.after(2000, () => {
      if (!this.up) this.endMotion('lease');
    });
    this.clock.after(5000, () => {
      if (!this.up) this.tell({ kind: 'lost', at: this.at(), why: 'no valid reply for 5 s' });
    });
    this.clock.after(forMs, () => this.restore(true));
  }

  restore(sameBoot: boolean): void {
    this.up = true;
    for (const event of this.unsaid.splice(0)) this.tell(event);
    this.tell({ kind: 'ready', at: this.at(), controller: this.controller(), sameBoot, unheard: null });
    for (const command of this.unconfirmed.splice(0)) this.halt(command);
  }

  /** The process that repeated unconfirmed stops and read events again is gone. */
  forget(): void {
    this.unconfirmed.length = 0;
    this.unsaid.length = 0;
  }

  /** Nobody has renewed the motion lease for 2 s. */
  lapseLease(): void {
    this.endMotion('lease');
  }

  openInterlock(): void {
    this.interlockClosed = false;
    this.say({ kind: 'interlock', at: this.at(), closed: false });
    this.endMotion('interlock');
  }

  loseSupply(): void {
    this.supplyPresent = false;
    this.endMotion('supply');
    this.angleDeg = null;
    this.say({ kind: 'supply', at: this.at(), present: false });
  }

  returnSupply(): void {
    this.supplyPresent = true;
    this.say({ kind: 'supply', at: this.at(), present: true });
  }

  /** The motion that is going on ends here and now. */
  endAt(cause: MotionEndCause): void {
    this.endMotion(cause);
  }

  tellArmKey(on: boolean): void {
    this.say({ kind: 'arm-key', at: this.at(), on });
  }

  tellLeaseLapsed(): void {
    this.say({ kind: 'lease-lapsed', at: this.at() });
  }

  edge(angleDeg: number | null, direction: 'ccw' | 'cw'): void {
    this.say({ kind: 'edge', at: this.at(), angleDeg, direction });
  }

  closeInterlock(): void {
    this.interlockClosed = true;
    this.say({ kind: 'interlock', at: this.at(), closed: true });
  }

  reset(): void {
    this.going?.cancel();
    this.waiting?.cancel();
    this.going = null;
    this.waiting = null;
    this.angleDeg = null;
    this.bootId = `${this.bootId}+`;
    this.warningDue = true;
    this.say({ kind: 'reset', at: this.at(), bootId: this.bootId });
    this.say({ kind: 'ready', at: this.at(), controller: this.controller(), sameBoot: false, unheard: null });
  }

  /** The angle now, also in a motion. */
  nowDeg(): number {
    return this.going === null ? (this.angleDeg ?? 0) : this.going.timeline((this.clock.utcMs() - this.going.beganUtcMs) / 1000);
  }

  at(utcMs = this.clock.utcMs()): Instant {
    return { utcMs, uS: 0.0002 };
  }

  private obey(command: Extract<LinkCommand, { kind: 'home' | 'move' }>): void {
    const { refuseNext } = this;
    this.refuseNext = null;
    if (refuseNext !== null) return this.say({ kind: 'refused', at: this.at(), commandId: command.id, ...refuseNext });
    if (this.going !== null || this.waiting !== null)
      return this.say({ kind: 'refused', at: this.at(), commandId: command.id, code: 'busy', message: 'an order is waiting or in motion' });
    this.say({ kind: 'accepted', at: this.at(), commandId: command.id });
    const delayMs = command.kind === 'move' && command.startUtcMs !== null ? command.startUtcMs - this.clock.utcMs() : 0;
    if (delayMs < 0)
      return this.say({ kind: 'refused', at: this.at(), commandId: command.id, code: 'past', message: 'the time of beginning has passed' });
    this.waiting = {
      id: command.id,
      cancel: this.clock.after(delayMs, () => {
        this.waiting = null;
        this.begin(command);
      }),
    };
  }

  private begin(command: Extract<LinkCommand, { kind: 'home' | 'move' }>): void {
    const fromDeg = this.angleDeg ?? 0;
    const toDeg = command.kind === 'home' ? 0 : command.targetDeg;
    const speed = command.kind === 'home' ? { speedDegS: 0.6, accelerationDegS2: 2 } : command;
    const { durationS, angleDegAt } = trapezoid({ fromDeg, toDeg, speedDegS: speed.speedDegS, accelerationDegS2: speed.accelerationDegS2 });
    this.motions.push({ commandId: command.id, beganUtcMs: this.clock.utcMs(), unheard: !this.up });
    const cancel = this.clock.after(1000 * durationS, () => {
      this.going = null;
      this.angleDeg = toDeg;
      if (command.kind === 'home') this.say({ kind: 'homed', at: this.at(), commandId: command.id, angleDeg: 0 });
      else this.say({ kind: 'motion-ended', at: this.at(), commandId: command.id, angleDeg: toDeg, cause: 'done' });
    });
    this.going = { id: command.id, fromDeg, toDeg, beganUtcMs: this.clock.utcMs(), timeline: angleDegAt, cancel };
    this.say({ kind: 'motion-began', at: this.at(), commandId: command.id, angleDeg: fromDeg });
  }

  private halt(command: Extract<LinkCommand, { kind: 'hold' | 'stop' }>): void {
    if (!this.up) {
      this.unconfirmed.push(command);
      return;
    }
    this.clock.after(5, () => {
      this.endMotion(command.kind);
      if (command.kind === 'stop' && command.releaseDrivers) this.angleDeg = null;
      this.clock.after(10, () => this.confirm(command.id));
    });
  }

  private confirm(commandId: string): void {
    this.say({ kind: 'standstill', at: this.at(), commandId, angleDeg: this.angleDeg });
  }

  private endMotion(cause: MotionEndCause): void {
    if (this.waiting !== null) {
      this.waiting.cancel();
      this.say({ kind: 'motion-ended', at: this.at(), commandId: this.waiting.id, angleDeg: this.angleDeg, cause });
      this.waiting = null;
    }
    if (this.going === null) return;
    this.angleDeg = this.nowDeg();
    this.going.cancel();
    this.say({ kind: 'motion-ended', at: this.at(), commandId: this.going.id, angleDeg: this.angleDeg, cause });
    this.going = null;
  }

  say(event: LinkEvent): void {
    if ('commandId' in event && event.kind !== 'standstill') this.ring.push(event);
    if (this.up) this.tell(event);
    else this.unsaid.push(event);
  }

  private tell(event: LinkEvent): void {
    if (this.loses.includes(event.kind)) return;
    for (const listener of [...this.listeners]) listener(event);
  }
}
