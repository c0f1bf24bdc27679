import type { EndCause, Happening, Limits, MachineState } from '@/firmware-protocol/codec';
import { Play } from './simulated-play';
import type { MotionOrder } from './simulated-refusals';
import { brakeStretches, rampStretches, reachedUs, Track, type Stretch } from './simulated-track';

export interface MotionSetting {
  /** As they are now: teaching changes them. */
  limits: Limits;
  /** True position at the start, microsteps from the home edge. */
  startSteps: number;
  homed: boolean;
  /** Play of the drive between the directions, microsteps. */
  backlashSteps: number;
  /** As in `MachineSetting`. */
  turnSteps: number | null;
  emit: (what: Happening, atUs: number) => void;
  /** SPEC 8.2: tested again at the first step; null when the motion may begin. */
  hindrance: () => EndCause | null;
}

/** What the table is doing for one order. */
interface Active {
  order: MotionOrder;
  state: 'waiting' | 'moving' | 'homing' | 'braking';
  beginUs: number;
  /** Why it will have ended when the present leg is over. */
  cause: EndCause;
  homing: 'search' | 'past' | 'below' | 'edge';
  acceleration: number;
  leg: Stretch[];
  endUs: number;
  edgeUs: number | null;
}

const MILLI = 1000;
/** The last approach of homing starts at least so far below the edge, microsteps. */
const CLEARANCE_STEPS = 8;
const TINY_STEPS = 1e-6;

/**
 * The moving part of the simulated controller: trapezoids, braking, homing, the home flag (SPEC 8, 9, 11.4). The flag
 * covers all places of the table below 0, or in each turn the half below. The motor is what is counted, from `zero`; between motor and table there is `play`.
 */
export class SimulatedMotion {
  readonly track: Track;
  known: boolean;
  driversOn: boolean;
  covered: boolean;
  /** SPEC 3.8: tag of the last order accepted since the start. */
  lastTag: string | null = null;
  private zero = 0;
  private readonly play: Play;
  private active: Active | null = null;

  constructor(private readonly setting: MotionSetting) {
    this.track = new Track(setting.startSteps);
    this.play = new Play(setting.backlashSteps);
    this.known = setting.homed;
    this.driversOn = setting.homed;
    this.covered = this.inTurn(setting.startSteps) < 0;
  }

  get state(): MachineState {
    return this.active?.state ?? 'rest';
  }

  /** Counted position (SPEC 5.4): whole steps already made; null while unknown. */
  position(us: number): number | null {
    return this.known ? this.steps(us) - this.zero : null;
  }

  accept(order: MotionOrder, beginUs: number): void {
    const { acceleration: cap } = this.setting.limits;
    const acceleration = (order.word === 'move' ? order.acceleration : cap) / MILLI;
    this.lastTag = order.tag;
    this.active = {
      order,
      state: 'waiting',
      beginUs,
      cause: 'done',
      homing: 'search',
      acceleration,
      leg: [],
      endUs: Infinity,
      edgeUs: null,
    };
  }

  /** Controller time of the next thing that happens by itself. */
  nextDueUs(): number {
    const active = this.active;
    if (active === null) return Infinity;
    return active.state === 'waiting' ? active.beginUs : Math.min(active.edgeUs ?? Infinity, active.endUs);
  }

  /** Lets the next thing happen, at its own time. */
  runNext(): void {
    const active = this.active;
    if (active === null) return;
    if (active.state === 'waiting') return this.begin(active);
    if (active.edgeUs !== null && active.edgeUs <= active.endUs) return this.passEdge(active, active.edgeUs);
    this.endLeg(active);
  }

  /** SPEC 9.1, 9.2, 10.2, 11.1: cancels what waits, decelerates what moves. `acceleration` null: that of the motion. */
  brake(us: number, cause: EndCause, acceleration: number | null): void {
    const active = this.active;
    if (active === null) return;
    if (active.state === 'waiting') return this.finish(active, us, cause);
    const steepness = Math.max(acceleration === null ? 0 : acceleration / MILLI, active.acceleration);
    if (active.state !== 'braking' || steepness > active.acceleration)
      this.setLeg(active, us, brakeStretches(this.track.at(us), steepness, us));
    if (active.state !== 'braking' || cause !== 'lease') active.cause = cause;
    active.state = 'braking';
    active.acceleration = steepness;
  }

  /** Pulses end at once: supply lost, `off`, reset. The position is unknown from here on (SPEC 8.7). */
  cutOff(us: number, cause: EndCause): void {
    this.track.cut(us, this.steps(us));
    const active = this.active;
    this.release();
    if (active !== null) this.finish(active, us, cause);
  }

  /** Drivers off at standstill. */
  release(): void {
    this.known = false;
    this.driversOn = false;
  }

  /** A reset forgets the order and the count, without a word (SPEC 7.3). */
  forget(us: number): void {
    this.track.cut(us, this.steps(us));
    this.zero = this.steps(us);
    this.active = null;
    this.lastTag = null;
    this.release();
  }

  /** The belt slips: the table moves by so many steps, and no count tells it but the one at the edge. */
  slip(steps: number, us: number): void {
    this.play.slip(us, this.track.at(us).position, steps);
    const table = this.inTurn(this.tableAt(us));
    if (this.covered ? table > -TINY_STEPS : table < TINY_STEPS - 1) this.changeFlag(us, this.position(us));
    if (this.active !== null) this.active.edgeUs = this.nextEdgeUs(this.active.leg, this.track.at(us).position);
  }

  /** Where the table truly is, microsteps from the home edge. */
  tableAt(us: number): number {
    return this.play.tableAt(us, this.track.at(us).position);
  }

  /** Where the table comes to rest if nothing is ordered any more and the lease ends at `leaseUntilUs`, microsteps from the home edge. */
  restIfLeft(us: number, leaseUntilUs: number): number {
    const { active } = this;
    if (active === null || active.leg.length === 0) return this.tableAt(us);
    const endUs = active.leg.at(-1)?.toUs ?? us;
    const lapseUs = Math.max(us, leaseUntilUs);
    if (active.state === 'braking' || endUs <= lapseUs) return this.tableAt(endUs);
    const at = this.track.at(lapseUs);
    return this.play.tableAt(lapseUs, brakeStretches(at, active.acceleration, lapseUs).at(-1)?.to ?? at.position);
  }

  private steps(us: number): number {
    const { position, speed } = this.track.at(us);
    return speed < 0 ? Math.ceil(position - TINY_STEPS) + 0 : Math.floor(position + TINY_STEPS);
  }

  private begin(active: Active): void {
    const us = active.beginUs;
    const { order } = active;
    const hindrance = this.setting.hindrance();
    if (hindrance !== null) return this.finish(active, us, hindrance);
    this.driversOn = true;
    active.state = order.word === 'home' ? 'homing' : 'moving';
    this.setting.emit({ word: 'began', tag: order.tag, position: this.position(us) }, us);
    if (order.word === 'home') return this.search(active, us);
    if (order.word === 'nudge') return this.setLeg(active, us, this.homeRamp(this.steps(us) + order.steps, us));
    this.setLeg(active, us, this.rampTo(order.position + this.zero, { speed: order.speed, acceleration: order.acceleration }, us));
  }

  private search(active: Active, us: number): void {
    const { least, greatest } = this.setting.limits;
    const travel = (greatest - least + 1) * (this.covered ? 1 : -1);
    this.setLeg(active, us, this.homeRamp(this.steps(us) + travel, us));
  }

  private homeRamp(to: number, us: number): Stretch[] {
    return this.rampTo(to, { speed: this.setting.limits.home, acceleration: this.setting.limits.acceleration }, us);
  }

  private rampTo(to: number, { speed, acceleration }: { speed: number; acceleration: number }, startUs: number): Stretch[] {
    return rampStretches({ from: this.steps(startUs), to, speed: speed / MILLI, acceleration: acceleration / MILLI, startUs });
  }

  private setLeg(active: Active, us: number, leg: Stretch[]): void {
    this.track.cut(us, this.track.at(us).position);
    this.track.add(leg);
    const [first] = leg;
    if (first !== undefined) this.play.turn(us, first.from, first.to < first.from ? -1 : 1);
    active.leg = leg;
    active.endUs = leg.at(-1)?.toUs ?? us;
    active.edgeUs = this.nextEdgeUs(leg, leg[0]?.from ?? 0);
  }

  /** When the leg passes an edge of the flag next, from a motor position on. */
  private nextEdgeUs(leg: readonly Stretch[], from: number): number | null {
    const first = leg[0];
    const last = leg.at(-1);
    if (first === undefined || last === undefined) return null;
    const up = last.to > first.from;
    const place = this.edgePlace(up, from);
    if (place === null) return null;
    return up ? (last.to >= place ? reachedUs(leg, place) : null) : last.to <= place ? reachedUs(leg, place) : null;
  }

  /** Motor position at which the flag changes its level next on a way up or down; null where it never does. */
  private edgePlace(up: boolean, from: number): number | null {
    const { turnSteps } = this.setting;
    const direction = up ? 1 : -1;
    // Met from below an edge lies on its place, from above one microstep further.
    const home = this.play.motorFor(up ? 0 : -1, direction);
    if (turnSteps === null) return up === this.covered ? home : null;
    const edge = up === this.covered ? home : home + direction * (turnSteps / 2);
    const ahead = (from - edge) * direction;
    return edge + direction * turnSteps * Math.ceil(ahead / turnSteps - TINY_STEPS);
  }

  /** Motor position at the home edge, met in ccw; of a table that makes whole turns in the turn about a motor position. */
  private homeEdge(near: number): number {
    const { turnSteps } = this.setting;
    const edge = this.play.motorFor(0, 1);
    return turnSteps === null ? edge : edge + turnSteps * Math.round((near - edge) / turnSteps);
  }

  /** A place of the table within the turn about the home edge; unchanged where it makes none. */
  private inTurn(table: number): number {
    const { turnSteps } = this.setting;
    return turnSteps === null ? table : table - turnSteps * Math.floor(table / turnSteps + 0.5);
  }

  private passEdge(active: Active, us: number): void {
    const { leg } = active;
    const up = (leg.at(-1)?.to ?? 0) > (leg[0]?.from ?? 0);
    const place = Math.round(this.track.at(us).position);
    this.changeFlag(us, this.known ? place - this.zero : null);
    active.edgeUs = this.nextEdgeUs(leg, place + (up ? 1 : -1));
    if (active.state !== 'homing' || active.homing !== 'search') return;
    active.homing = 'past';
    this.setLeg(active, us, brakeStretches(this.track.at(us), active.acceleration, us));
  }

  private changeFlag(us: number, position: number | null): void {
    this.covered = !this.covered;
    this.setting.emit({ word: 'edge', position, direction: this.covered ? 'cw' : 'ccw' }, us);
  }

  private endLeg(active: Active): void {
    const us = active.endUs;
    const edge = this.homeEdge(this.steps(us));
    if (active.state !== 'homing') return this.finish(active, us, active.cause);
    switch (active.homing) {
      case 'search':
        this.known = false;
        return this.finish(active, us, 'search');
      case 'past':
        active.homing = 'below';
        return this.setLeg(
          active,
          us,
          this.homeRamp(edge - this.setting.backlashSteps - Math.abs(this.steps(us) - edge) - CLEARANCE_STEPS, us),
        );
      case 'below':
        active.homing = 'edge';
        return this.setLeg(active, us, this.homeRamp(edge, us));
      case 'edge':
        this.setting.emit({ word: 'homed', tag: active.order.tag, position: this.known ? edge - this.zero : null }, us);
        this.zero = edge;
        this.known = true;
        this.finish(active, us, 'done');
    }
  }

  private finish(active: Active, us: number, cause: EndCause): void {
    this.active = null;
    this.setting.emit({ word: 'ended', tag: active.order.tag, position: this.position(us), cause }, us);
  }
}
