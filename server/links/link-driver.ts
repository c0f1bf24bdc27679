import { decodeLine, type HiBody, type Order } from '@/firmware-protocol/codec';
import type { RigMotion } from '@/shared/rig/document';
import type { ByteLineFactory } from '../interfaces/byte-line';
import { type Cancel, type Clock, wallUtcMs } from '../interfaces/clock';
import type {
  ControllerLimits,
  ControllerState,
  LinkCommand,
  LinkEvent,
  LinkHealth,
  MotionSent,
  TeachOutcome,
  TurntableLink,
} from '../interfaces/turntable-link';
import { ClockModel } from './clock-model';
import { CommandBook } from './command-book';
import { ControllerReport } from './controller-report';
import { Conversation } from './conversation';
import { Lease } from './lease';
import { LinkConnection } from './link-connection';
import { LinkMetrics } from './link-metrics';
import { LinkTelling } from './link-telling';
import { limitsRemark, silence, teachRefusal } from './link-words';
import { degOfLimits, limitsOfDeg, milliStepsOf, stepsOfDeg, stepsOfTurn } from './rig-units';
import { Teaching } from './teaching';
import { Wire } from './wire';

export interface LinkOptions {
  factory: ByteLineFactory;
  clock: Clock;
  rig: RigMotion;
  /** Number of this driver's rig lease; a controller that has met a higher one refuses it (SPEC 3.3). */
  epoch: number;
}

const HEARTBEAT_MS = 500;
/** A link without a valid reply for so long is lost. */
const SILENCE_MS = 5_000;
/** In a motion it is lost as soon as the motion lease must have lapsed. */
const SILENCE_IN_MOTION_MS = 2_000;
const MOST_COMMANDS = 16;

/**
 * Drives one controller over one line (SPEC.md): says hello, keeps the lease, sends commands at most once, reads
 * events again that were lost, and finds the line again when it breaks. All time comes from the injected clock.
 */
export function createLink(options: LinkOptions): TurntableLink {
  return new LinkDriver(options);
}

class LinkDriver implements TurntableLink {
  private readonly model = new ClockModel();
  private readonly lease = new Lease();
  private readonly teaching = new Teaching();
  private readonly metrics: LinkMetrics;
  private readonly report: ControllerReport;
  private readonly telling: LinkTelling;
  private readonly wire: Wire;
  private readonly book: CommandBook;
  private readonly connection: LinkConnection;
  private readonly talk: Conversation;
  private cancelHeartbeat: Cancel = () => undefined;
  private lastReply: { monotonicMs: number; utcMs: number | null } = { monotonicMs: 0, utcMs: null };
  private discarded = { lines: 0, bytes: 0 };
  /** On the present line: lines that were dropped, and whether any reply was valid. */
  private here = { dropped: 0, answered: false };

  constructor(private readonly options: LinkOptions) {
    const { clock, rig, factory, epoch } = options;
    const { model, lease, teaching } = this;
    const metrics = (this.metrics = new LinkMetrics({
      ...{ clock, model, factory },
      stepped: (which, byMs) => this.telling.tell({ kind: 'clock-stepped', at: this.telling.now(), clock: which, byMs }),
    }));
    const report = (this.report = new ControllerReport(rig));
    const telling = (this.telling = new LinkTelling({ clock, model, report, rig }));
    const wire = (this.wire = new Wire(clock, epoch, () => this.act(() => undefined)));
    const book = (this.book = new CommandBook({
      compose: (command, tag) => this.orderOf(command, tag),
      told: (entry, effect, reply) => telling.command(entry, effect, { reply, event: this.talk.event }),
    }));
    const connection = (this.connection = new LinkConnection({
      factory,
      clock,
      onOpened: (line) =>
        this.act(() => {
          this.here = { dropped: 0, answered: false };
          this.lastReply.monotonicMs = clock.monotonicMs();
          metrics.begin();
          this.talk.begin();
          wire.attach(line);
        }),
      onLine: (line) => this.act(() => this.read(line)),
      onFailed: (why) => this.act(() => this.fail('lost', why)),
    }));
    this.talk = new Conversation({
      ...{ clock, wire, book, telling, model, metrics, teaching, lease, report },
      ready: (sameBoot) => {
        connection.ready(this.remark());
        const controller = this.controller();
        if (controller !== null)
          telling.tell({ kind: 'ready', at: telling.now(), controller, sameBoot, unheard: report.unheard(clock.utcMs()) });
      },
      refused: (why) => this.fail('refused', why),
    });
  }

  open(): void {
    if (this.connection.condition !== 'closed') return;
    this.connection.open();
    this.beat();
  }

  async close(): Promise<void> {
    this.connection.close();
    this.cancelHeartbeat();
    const closed = this.letGo();
    this.telling.flush();
    await closed;
  }

  health(): LinkHealth {
    const { condition, detail, reconnects } = this.connection;
    return {
      ...{ condition, detail, reconnects },
      lastReplyUtcMs: this.lastReply.utcMs,
      discardedLines: this.discarded.lines,
      discardedBytes: this.discarded.bytes,
      droppedByController: this.report.dropped,
      retries: this.wire.retries,
      higherEpoch: this.talk.higherEpoch,
      ...this.metrics.health(),
      ...identity(this.talk.hi),
    };
  }

  controller(): ControllerState | null {
    const { hi } = this.talk;
    return hi === null ? null : this.report.view(hi.boot, hi.firmware);
  }

  limits(): ControllerLimits | null {
    const { limits } = this.talk;
    return limits === null ? null : degOfLimits(this.options.rig, limits);
  }

  async teach(limits: ControllerLimits): Promise<TeachOutcome> {
    const { rig } = this.options;
    const { condition, detail } = this.connection;
    if (condition !== 'ready') return { taught: false, code: 'no-session', message: `there is no link to the controller: ${detail}` };
    const answered = this.teaching.add(limitsOfDeg(rig, limits));
    this.act(() => undefined);
    const answer = await answered;
    if (answer?.word !== 'lim') return { taught: false, ...teachRefusal(rig, answer) };
    this.connection.remark(this.remark());
    return { taught: true, limits: degOfLimits(rig, answer) };
  }

  setLeaseRule(mayRenew: () => boolean): void {
    this.lease.setRule(mayRenew);
  }

  subscribe(listener: (event: LinkEvent) => void): () => void {
    return this.telling.subscribe(listener);
  }

  send(command: LinkCommand): void {
    this.act(() => {
      if (command.kind === 'hold' || command.kind === 'stop') return this.addStop(command);
      const { condition, detail } = this.connection;
      if (condition !== 'ready') return this.telling.refused(command.id, 'no-session', `there is no link to the controller: ${detail}`);
      if (this.book.length >= MOST_COMMANDS) return this.telling.refused(command.id, 'busy', 'too many orders wait for the controller');
      this.lease.wanted();
      this.book.add(command);
    });
  }

  takeUp(motions: readonly MotionSent[]): void {
    if (motions.length === 0) return;
    this.act(() => {
      for (const motion of motions) this.book.takeUp(motion);
      this.talk.readFromOldest();
    });
  }

  raiseEpoch(epoch: number): void {
    this.wire.epoch = Math.max(this.wire.epoch, epoch);
  }

  /** Everything that comes from outside runs through here: then what can be sent is sent, and what is to be told is told. */
  private act(deed: () => void): void {
    deed();
    this.talk.pump();
    this.telling.flush();
  }

  /** Orders that have not gone out do not go out any more; one that is in flight is overtaken when the stop is written. */
  private addStop(command: LinkCommand): void {
    this.lease.stopRenewing();
    this.book.each((entry) => {
      if (entry.of === 'motion' && entry.life.phase === 'queued') this.wire.input(entry, { kind: 'overtaken' });
    });
    this.book.add(command);
  }

  private orderOf(command: LinkCommand, tag: string): Order {
    const { rig, clock } = this.options;
    switch (command.kind) {
      case 'home':
        return { word: 'home', tag };
      case 'nudge':
        return { word: 'nudge', tag, steps: stepsOfTurn(rig, command.turnDeg) };
      case 'hold':
        return { word: 'hold' };
      case 'stop':
        return { word: 'stop', drivers: command.releaseDrivers && rig.safeWhenFree === true ? 'free' : 'keep' };
      case 'move': {
        const { targetDeg, speedDegS, accelerationDegS2, startUtcMs } = command;
        const beginUs =
          startUtcMs === null ? null : Math.max(0, this.model.controllerUsAt(startUtcMs - clock.utcMs() + clock.monotonicMs()));
        const [speed, acceleration] = [milliStepsOf(rig, speedDegS), milliStepsOf(rig, accelerationDegS2)];
        return { word: 'move', tag, position: stepsOfDeg(rig, targetDeg), speed, acceleration, beginUs };
      }
    }
  }

  private remark(): string | null {
    const { limits } = this.talk;
    const remarks = [this.wire.lineRemark, limits === null ? null : limitsRemark(this.options.rig, limits)];
    return remarks.filter((remark) => remark !== null).join(' ') || null;
  }

  private read(line: string): void {
    const item = decodeLine(line);
    if (item.kind === 'reply') {
      this.here.answered = true;
      this.lastReply = { monotonicMs: this.options.clock.monotonicMs(), utcMs: wallUtcMs(this.options.clock) };
      this.talk.hearReply(item, line.length + 1);
    } else if (item.kind === 'event') this.talk.hearEvent(item);
    else if (item.kind !== 'blank') {
      this.discarded.lines += 1;
      this.discarded.bytes += line.length + 1;
      this.here.dropped += 1;
    }
  }

  private beat(): void {
    this.cancelHeartbeat = this.options.clock.after(HEARTBEAT_MS, () => {
      this.beat();
      this.act(() => {
        this.talk.heartbeatDue = true;
        this.metrics.watchHost();
        this.noticeSilence();
      });
    });
  }

  private noticeSilence(): void {
    if (!this.wire.attached) return;
    const silentMs = this.options.clock.monotonicMs() - this.lastReply.monotonicMs;
    const inMotion = this.book.motionGoing || (this.report.known && !this.report.atRest);
    if (inMotion && this.connection.condition === 'ready' && silentMs >= SILENCE_IN_MOTION_MS) {
      return this.fail('lost', 'No valid reply from the controller for 2 s in a motion: its motion lease has lapsed.');
    }
    if (silentMs < SILENCE_MS) return;
    const { dropped, answered } = this.here;
    this.fail(dropped > 0 && !answered ? 'refused' : 'lost', silence(this.connection.description, dropped, answered));
  }

  /** The line is of no use any more. */
  private fail(condition: 'lost' | 'refused', why: string): void {
    const before = this.connection.condition;
    void this.letGo();
    this.connection.failed(condition, why);
    if (before === 'ready') this.telling.tell({ kind: 'lost', at: this.telling.now(), why });
    if (condition === 'refused' && before !== 'refused') this.telling.tell({ kind: 'refused-controller', at: this.telling.now(), why });
  }

  private async letGo(): Promise<void> {
    this.lease.end();
    this.teaching.cutOff();
    const detached = this.wire.detach();
    this.book.each((entry) => this.wire.input(entry, { kind: 'cut-off' }));
    await detached;
  }
}

function identity(hi: HiBody | null): Pick<LinkHealth, 'bootId' | 'firmware' | 'protocol'> {
  return { bootId: hi?.boot ?? null, firmware: hi?.firmware ?? null, protocol: hi === null ? null : `${hi.major}.${hi.minor}` };
}
