import {
  decodeLine,
  LEASE_MS,
  NO_SESSION,
  WARNING_MS,
  type BootCause,
  type EndCause,
  type Happening,
  type Limits,
  type NoBody,
  type OkBody,
  type Order,
  type ReplyBody,
  type Request,
  type TeachOrder,
  type UnusableRequest,
} from '@/firmware-protocol/codec';
import type { MachineSetting } from './machine-setting';
import { SimulatedMotion } from './simulated-motion';
import { no, refusalOf, teachRefusal, type MotionOrder } from './simulated-refusals';
import { hiBody, okBody, type MachineFacts } from './simulated-report';
import { SessionDesk } from './simulated-session';
import { SimulatedStart } from './simulated-start';
import { SimulatedVoice } from './simulated-voice';

type StopOrder = Extract<Order, { word: 'hold' | 'stop' | 'off' }>;
type SessionOrder = Exclude<Order, StopOrder | { word: 'ident' | 'hello' }>;

const MS = 1000;

/**
 * The controller of SPEC.md as a machine without a clock: it is told what arrives when, and tells what it sends when.
 * Times are microseconds of an own scale that a reset does not break; stamps count from the last start.
 */
export class SimulatedMachine {
  readonly motion: SimulatedMotion;
  private readonly inputs = { interlock: true, supply: true, key: true };
  private readonly desk = new SessionDesk();
  private readonly start: SimulatedStart;
  private readonly voice: SimulatedVoice;
  /** In non-volatile memory: a reset does not change them (SPEC 8.10). */
  private readonly limits: Limits;
  private motionEnded = false;
  private warningDue: boolean;
  private freeDriversAtRest = false;
  private leaseUntilUs = -Infinity;
  private dropped = 0;
  private nowUs = 0;

  /** `send`: one line, line feed included, that the controller begins to send at `atUs`. */
  constructor(
    private readonly setting: MachineSetting,
    send: (line: string, atUs: number) => void,
  ) {
    this.start = new SimulatedStart(setting.bootCount, setting.uptimeUs);
    this.voice = new SimulatedVoice(this.start, send);
    this.limits = { ...setting.limits };
    this.warningDue = !setting.warned;
    const emit = (what: Happening, atUs: number) => this.happen(what, atUs);
    this.motion = new SimulatedMotion({
      ...setting,
      limits: this.limits,
      emit,
      hindrance: () => this.hindrance(),
    });
    this.voice.ring.note({ word: 'boot', cause: 'power' }, 0);
  }

  /** What a restart of everything else would find: where the table comes to rest by itself, and whether it is counted. */
  ifLeft(us: number): { steps: number; known: boolean } {
    return { steps: this.motion.restIfLeft(us, this.leaseUntilUs), known: this.motion.known };
  }

  /** When something happens next without anything arriving. */
  nextDueUs(): number {
    return this.start.doneUs ?? Math.min(this.motion.nextDueUs(), this.leaseDueUs());
  }

  /** Lets everything happen that is due up to `us`, each at its own time. */
  runTo(us: number): void {
    for (let due = this.nextDueUs(); due <= us; due = this.nextDueUs()) {
      this.nowUs = Math.max(this.nowUs, due);
      if (this.start.doneUs !== null) this.finishStart();
      else if (this.leaseDueUs() <= this.motion.nextDueUs()) this.lapse();
      else this.motion.runNext();
    }
    this.nowUs = Math.max(this.nowUs, us);
  }

  /** A line whose line feed arrives at `us`. */
  receive(line: string, us: number): void {
    this.runTo(us);
    if (this.start.doneUs !== null) return;
    const item = decodeLine(line);
    if (item.kind === 'request') this.obey(item, line);
    else if (item.kind === 'unusable') this.answerSession(item, line, () => no(item.code));
    else if (item.kind !== 'blank') this.dropped = (this.dropped + 1) & 0xffff;
  }

  /** SPEC 11.1 to 11.3. True: interlock closed, supply present, arm key on. */
  setInput(input: keyof SimulatedMachine['inputs'], on: boolean, us: number): void {
    this.runTo(us);
    const changed = on !== this.inputs[input];
    this.inputs[input] = on;
    if (this.start.doneUs !== null || !changed) return;
    if (input === 'key') return this.happen({ word: 'key', on }, us);
    this.happen(input === 'interlock' ? { word: 'interlock', closed: on } : { word: 'supply', present: on }, us);
    if (on) return;
    if (input === 'supply') return this.motion.cutOff(us, 'supply');
    this.leaseUntilUs = us;
    this.warningDue = true;
    this.motion.brake(us, 'interlock', this.limits.acceleration);
  }

  /** The controller restarts; it hears nothing until it has started again. */
  reset(us: number, cause: BootCause): void {
    this.runTo(us);
    this.motion.forget(us);
    this.start.begin(us, cause);
    this.desk.forget();
    this.voice.ring.clear();
    this.leaseUntilUs = -Infinity;
    this.freeDriversAtRest = false;
  }

  private finishStart(): void {
    const started = this.start.finish();
    if (started === null) return;
    this.dropped = 0;
    this.motionEnded = false;
    this.warningDue = true;
    this.happen({ word: 'boot', cause: started.cause }, started.atUs);
  }

  /** When the lease will lapse in a way that matters (SPEC 10.2). */
  private leaseDueUs(): number {
    const { state } = this.motion;
    return state === 'rest' || state === 'braking' ? Infinity : this.leaseUntilUs;
  }

  private lapse(): void {
    const us = this.nowUs;
    this.happen({ word: 'lease', position: this.motion.position(us) }, us);
    this.motion.brake(us, 'lease', null);
  }

  private hindrance(): EndCause | null {
    if (!this.leaseLive()) return 'lease';
    if (!this.inputs.interlock) return 'interlock';
    return this.inputs.supply ? null : 'supply';
  }

  private leaseLive(): boolean {
    return this.nowUs < this.leaseUntilUs;
  }

  private obey(request: Request, line: string): void {
    const { order } = request;
    switch (order.word) {
      case 'ident':
        return void this.answer(request, this.greeting(NO_SESSION));
      case 'hello':
        return void this.answer(request, this.hello(request.epoch));
      case 'hold':
      case 'stop':
      case 'off':
        return this.obeyStop(request, order, line);
      default:
        return this.answerSession(request, line, () => this.carryOut(order));
    }
  }

  private answerSession(request: Request | UnusableRequest, line: string, carryOut: () => ReplyBody): void {
    const admission = this.desk.admit(request, line);
    if (admission.kind === 'repetition') return this.voice.repeat(admission.reply, this.nowUs);
    if (admission.kind === 'refused') return void this.answer(request, admission.body);
    const body = carryOut();
    this.desk.keep(request, line, this.answer(request, body));
    if (request.kind === 'request' && request.order.word === 'events' && body.word === 'ok')
      this.voice.sendAgain(request.order.from, this.nowUs);
  }

  /** SPEC 9.4: in every state, from everyone; only a true repetition does nothing. */
  private obeyStop(request: Request, order: StopOrder, line: string): void {
    const repetition = this.desk.repetition(request, line);
    if (repetition?.kind === 'repetition') return this.voice.repeat(repetition.reply, this.nowUs);
    this.stop(order);
    this.desk.keep(request, line, this.answer(request, this.report()));
  }

  private stop(order: StopOrder): void {
    const us = this.nowUs;
    this.leaseUntilUs = us;
    if (order.word === 'off') return this.motion.cutOff(us, 'off');
    if (order.word === 'hold') return this.motion.brake(us, 'hold', null);
    this.motionEnded = true;
    if (order.drivers === 'free') this.freeDriversAtRest = true;
    this.motion.brake(us, 'stop', this.limits.acceleration);
    this.releaseAtRest();
  }

  private releaseAtRest(): void {
    if (!this.freeDriversAtRest || this.motion.state !== 'rest') return;
    this.freeDriversAtRest = false;
    this.motion.release();
  }

  private hello(epoch: number): ReplyBody {
    if (epoch > this.desk.highestEpoch) this.leaseUntilUs = this.nowUs;
    const session = this.desk.open(epoch, this.start.count);
    if (session === null) return no('epoch', this.desk.highestEpoch);
    this.motionEnded = false;
    if (this.motion.state === 'waiting') this.motion.brake(this.nowUs, 'session', null);
    return this.greeting(session);
  }

  private greeting(session: string): ReplyBody {
    return hiBody(this.setting, this.start.count, session);
  }

  private carryOut(order: SessionOrder): ReplyBody {
    switch (order.word) {
      case 'status':
        return this.report();
      case 'renew':
        this.leaseUntilUs = this.nowUs + LEASE_MS * MS;
        return this.report();
      case 'limits':
        return { word: 'lim', ...this.limits };
      case 'events':
        return order.from < this.voice.ring.oldest || order.from > this.voice.ring.newest
          ? no('gone', this.voice.ring.oldest)
          : this.report();
      case 'teach':
        return this.teach(order);
      case 'home':
      case 'move':
      case 'nudge':
        return this.refusal(order) ?? this.accept(order);
    }
  }

  private teach(order: TeachOrder): ReplyBody {
    const { least, greatest, speed, acceleration, home } = order;
    const refusal = teachRefusal(order, this.facts());
    if (refusal === null) Object.assign(this.limits, { least, greatest, speed, acceleration, home });
    return refusal ?? { word: 'lim', ...this.limits };
  }

  private refusal(order: MotionOrder): NoBody | null {
    const aheadMs = order.word === 'move' && order.beginUs !== null ? (this.start.usOf(order.beginUs) - this.nowUs) / MS : null;
    return refusalOf(order, { ...this.facts(), limits: this.limits, lastTag: this.motion.lastTag, aheadMs });
  }

  private accept(order: MotionOrder): ReplyBody {
    if (this.warningDue) this.happen({ word: 'warn', tag: order.tag }, this.nowUs);
    const soonestUs = this.nowUs + (this.warningDue ? WARNING_MS * MS : 0);
    const beginUs = order.word === 'move' && order.beginUs !== null ? this.start.usOf(order.beginUs) : soonestUs;
    this.motion.accept(order, beginUs);
    if (beginUs <= this.nowUs) this.motion.runNext();
    return this.report();
  }

  private report(): OkBody {
    return okBody(this.facts());
  }

  private facts(): MachineFacts {
    const { motion, inputs } = this;
    return {
      state: motion.state,
      position: motion.position(this.nowUs),
      positionKnown: motion.known,
      interlockClosed: inputs.interlock,
      supplyPresent: inputs.supply,
      armKey: inputs.key,
      driversOn: motion.driversOn,
      homeFlag: motion.covered,
      leaseLive: this.leaseLive(),
      motionEnded: this.motionEnded,
      warningDue: this.warningDue,
      event: this.voice.ring.newest,
      dropped: this.dropped,
    };
  }

  private answer(request: Request | UnusableRequest, body: ReplyBody): string {
    return this.voice.answer(request, body, this.nowUs);
  }

  private happen(what: Happening, us: number): void {
    if (what.word === 'began') this.warningDue = false;
    this.voice.happen(what, us);
    if (what.word === 'ended') this.releaseAtRest();
  }
}
