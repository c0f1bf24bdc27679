import {
  EVENTS_AT_ONCE,
  FLAG,
  PROTOCOL_VERSION,
  type EventMessage,
  type HiBody,
  type LimitsBody,
  type NoBody,
  type OkBody,
  type Order,
  type Reply,
  type ReplyBody,
} from '@/firmware-protocol/codec';
import { isTimed } from './command-book';
import type { CommandInput } from './command-life';
import type { ConversationSetting } from './conversation-setting';
import { EventSequence } from './event-sequence';
import { epochRefusal, versionRefusal } from './link-words';
import type { LiveRequest } from './wire';

/** What is asked next on a fresh line or session. */
type Phase = 'hello' | 'limits' | 'status' | 'talking';

/** A question of the driver's own; `heard` gets its reply. */
interface Ask extends LiveRequest {
  heard(reply: Reply): void;
}

/**
 * What is said to the controller and what its answers mean: the greeting of a line or session, the order of requests,
 * replies, and events in their order.
 */
export class Conversation {
  phase: Phase = 'hello';
  hi: HiBody | null = null;
  /** The event that is being told. */
  event: EventMessage | null = null;
  /** The controller's own limits, as told last. */
  limits: LimitsBody | null = null;
  /** Epoch of another driver that keeps this one out. */
  higherEpoch: number | null = null;
  heartbeatDue = false;
  private readonly events = new EventSequence();
  /** Events count from the first status of a boot on; what comes before belongs to somebody else. */
  private following = false;
  private announced = false;
  /** Boot identifier when the link was last ready. */
  private bootBefore: string | null = null;
  private lastEventUs = 0;
  private rereadUpTo = 0;
  private ask: Ask | null = null;

  constructor(private readonly setting: ConversationSetting) {}

  /** A fresh line. */
  begin(): void {
    this.announced = false;
    this.greet();
  }

  /** The session is over: a new one on the same line. */
  private greet(): void {
    this.phase = 'hello';
  }

  /** Commands of another process were taken up: before the link is ready, all is read again that the controller still keeps of them (SPEC 7.4). */
  readFromOldest(): void {
    if (!this.following) return;
    this.events.rereadAll();
    [this.lastEventUs, this.rereadUpTo, this.announced] = [0, 0, false];
  }

  hearEvent(event: EventMessage): void {
    if (!this.following) return;
    if (this.hasRestarted(event)) {
      this.following = false;
      this.setting.wire.cutOff();
      return this.greet();
    }
    this.deliver(this.events.add(event));
  }

  hearReply(reply: Reply, bytes: number): void {
    const { wire, report, book } = this.setting;
    const request = wire.requestOf(reply);
    const { body } = reply;
    if (body.word === 'hi' && request !== null) this.meet(body);
    if (request !== null) this.setting.metrics.measure(request, reply, bytes);
    if (body.word === 'ok' && reply.session === wire.session && this.following) {
      report.takeReply(reply, body);
      this.events.heardOf(body.event);
      if (request?.sent) book.noteAnswered(request.sent, body.event);
    }
    if (request === null) return;
    if (body.word === 'no') this.hearNo(request, reply, body);
    else this.setting.wire.input(request, { kind: 'ok' }, reply);
    if (request === this.ask) this.ask.heard(reply);
    this.settle();
  }

  /** Sends what is to be sent next, if the line is free for it. Stops come before everything else. */
  pump(): void {
    const { wire, book } = this.setting;
    if (!wire.attached) return;
    const stop = book.first('stop', 'queued');
    if (stop !== undefined && wire.inFlight?.of !== 'stop') {
      wire.overtake();
      return wire.send(stop);
    }
    if (wire.inFlight !== null) return;
    if (this.phase !== 'talking') return this.askNext(this.phase);
    const missing = this.events.missing;
    if (missing !== null && missing > this.rereadUpTo) return this.askAgain(missing);
    if (this.pumpMotion()) return;
    if (this.heartbeatDue) return this.askHeartbeat();
    const lesson = this.setting.teaching.next();
    if (lesson !== null) this.put(lesson, ({ body }) => this.heardLesson(body));
  }

  /** True when something was sent, or must be waited for, for the sake of a motion. */
  private pumpMotion(): boolean {
    const { wire, book, lease, report, clock, telling, model } = this.setting;
    const motion = book.first('motion', 'queued');
    if (motion === undefined) return false;
    if (report.has(FLAG.motionEnded)) {
      // A stop ended the motion of the session: the engine orders anew, so it is a new start (SPEC 9.2).
      this.greet();
      this.askNext('hello');
      return true;
    }
    if (lease.isFresh(clock.monotonicMs()) && (model.known || !isTimed(motion.command))) {
      wire.send(motion);
      return true;
    }
    if (lease.mayRenew()) {
      this.askHeartbeat();
      return true;
    }
    telling.refused(motion.command.id, 'not-renewed', 'the motion lease may not be renewed at present, so nothing may move');
    book.remove(motion);
    return this.pumpMotion();
  }

  private askNext(phase: Exclude<Phase, 'talking'>): void {
    if (phase === 'hello') return this.put({ word: 'hello', ...PROTOCOL_VERSION }, (reply) => this.heardHello(reply), 'hello');
    if (phase === 'limits') return this.put({ word: 'limits' }, ({ body }) => body.word === 'lim' && this.heardLimits(body));
    this.put({ word: 'status' }, (reply) => reply.body.word === 'ok' && this.heardFirstStatus(reply, reply.body));
  }

  private askHeartbeat(): void {
    const { lease } = this.setting;
    this.heartbeatDue = false;
    const renews = lease.mayRenew();
    this.put({ word: renews ? 'renew' : 'status' }, ({ body }) => {
      // A gap that is still there now was not filled by the events that were asked for.
      this.rereadUpTo = 0;
      if (renews && body.word === 'ok' && lease.mayRenew()) lease.confirm(this.ask?.sent?.atMs ?? -Infinity);
    });
  }

  private askAgain(from: number): void {
    this.rereadUpTo = from + EVENTS_AT_ONCE - 1;
    this.put({ word: 'events', from }, ({ body }) => {
      if (body.word === 'no' && body.code === 'gone') this.deliver(this.events.skipTo(body.detail));
    });
  }

  private put(order: Order, heard: (reply: Reply) => unknown, of: 'ask' | 'hello' = 'ask'): void {
    this.ask = {
      of,
      life: { phase: 'queued' },
      sent: null,
      compose: () => order,
      told: () => undefined,
      heard: (reply) => void heard(reply),
    };
    this.setting.wire.send(this.ask);
  }

  /** The controller's greeting; a new boot identifier means that everything known of it is void. */
  private meet(hi: HiBody): void {
    const { model, telling, report, book } = this.setting;
    const before = this.hi;
    this.hi = hi;
    if (before?.boot === hi.boot) return;
    model.forget();
    report.forget();
    this.lastEventUs = 0;
    this.following = false;
    this.announced = false;
    if (before === null) return;
    // The events of the new start are all of interest, those before the first greeting ever are not.
    this.events.startAfter(0);
    this.following = true;
    telling.tell({ kind: 'reset', at: telling.now(), bootId: hi.boot });
    book.each((entry) => this.input(entry, { kind: 'reset' }));
  }

  private heardHello({ body }: Reply): void {
    if (body.word === 'no') {
      if (body.code === 'epoch') return this.keptOut(body.detail);
      return this.setting.refused(`The controller refuses to be greeted (${body.code}).`);
    }
    if (body.word !== 'hi') return;
    this.higherEpoch = null;
    const why = versionRefusal(body);
    if (why !== null) return this.setting.refused(why);
    this.setting.wire.openSession(body.session);
    this.phase = 'limits';
  }

  private heardLimits(body: LimitsBody): void {
    this.limits = body;
    this.phase = 'status';
  }

  private heardLesson(body: ReplyBody): void {
    if (body.word === 'lim') this.limits = body;
    this.setting.teaching.heard(body);
  }

  private heardFirstStatus(reply: Reply, body: OkBody): void {
    if (!this.following) this.events.startAfter(body.event);
    this.following = true;
    this.setting.report.takeReply(reply, body);
    this.events.heardOf(body.event);
    this.phase = 'talking';
    this.rereadUpTo = 0;
  }

  /** Another server's epoch is higher (SPEC 3.3). */
  private keptOut(epoch: number): void {
    this.higherEpoch = epoch;
    this.setting.refused(epochRefusal(epoch));
  }

  private hearNo(request: LiveRequest, reply: Reply, { code, detail }: NoBody): void {
    const { wire } = this.setting;
    if (code === 'session' && request.of !== 'hello') {
      this.input(request, { kind: 'cut-off' });
      return this.greet();
    }
    if (code === 'epoch' && request.of !== 'hello') {
      this.input(request, { kind: 'no' }, reply);
      return this.keptOut(detail);
    }
    if (code === 'repeat') return wire.input(request, { kind: 'ok' }, reply);
    if (code === 'old' || code === 'reused') return wire.input(request, { kind: 'cut-off' });
    wire.input(request, { kind: 'no' }, reply);
  }

  /** Stamps go up within a start, and a start begins with event 1. */
  private hasRestarted({ number, atUs, what }: EventMessage): boolean {
    if (what.word === 'boot') return this.events.hasGivenOn(Math.max(2, number));
    return !this.events.hasGivenOn(number) && atUs < this.lastEventUs;
  }

  private deliver(events: readonly EventMessage[]): void {
    const { report, book, telling, lease } = this.setting;
    for (const event of events) {
      const { what } = event;
      // Of what happened before anybody here listened, only what became of own commands is told, and at `ready` whether somebody was let in.
      const isPast = this.events.isPast(event.number);
      this.event = event;
      this.lastEventUs = event.atUs;
      report.takeEvent(event, { isPast });
      if (!isPast && (what.word === 'interlock' || what.word === 'lease')) lease.end();
      const entry = what.word === 'began' || what.word === 'ended' ? book.byTag(what.tag) : undefined;
      if (entry !== undefined) this.input(entry, { kind: what.word === 'began' ? 'began' : 'ended' });
      if (!isPast) telling.happening(event);
      this.event = null;
    }
    this.settle();
  }

  /** What follows once all events are read that the last reply knew of. */
  private settle(): void {
    const { book, report } = this.setting;
    const hasGivenOn = (number: number) => this.events.hasGivenOn(number);
    book.resolved(hasGivenOn, (entry, input) => this.input(entry, input));
    // A stop is answered before the greeting of a fresh line tells whether the controller restarted: its standstill waits for that.
    if (!this.following || !report.known || this.phase !== 'talking') return;
    if (report.atRest && hasGivenOn(report.upTo.event)) {
      book.each((entry) => this.input(entry, { kind: 'standstill' }));
      book.dropTakenUp();
    }
    if (this.announced || this.events.missing !== null) return;
    const sameBoot = this.bootBefore === this.hi?.boot;
    this.announced = true;
    this.bootBefore = this.hi?.boot ?? null;
    this.setting.ready(sameBoot);
  }

  private input(request: LiveRequest, input: CommandInput, reply: Reply | null = null): void {
    this.setting.wire.input(request, input, reply);
  }
}
