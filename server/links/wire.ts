import { encode, NO_SESSION, type Order, type Reply } from '@/firmware-protocol/codec';
import type { ByteLine } from '../interfaces/byte-line';
import type { Cancel, Clock } from '../interfaces/clock';
import { advanceCommand, type CommandEffect, type CommandInput, type CommandLife, type RequestClass } from './command-life';

/** A request with its life, and who is told of it. */
export interface LiveRequest {
  readonly of: RequestClass;
  life: CommandLife;
  /** Composed when it is sent for the first time. */
  compose(): Order;
  /** As it was sent last. */
  sent: SentAs | null;
  /** Called for every effect but `write`. */
  told(effect: CommandEffect, reply: Reply | null): void;
}

export interface SentAs {
  session: string;
  number: number;
  line: string;
  /** Host's monotonic time of the first writing, ms. */
  atMs: number;
  attempts: number;
}

/** Modulus of request numbers (SPEC 3.6). */
const NUMBER_MASK = 0xffff;

/**
 * The requests on one line: numbers them, writes them, repeats them as their life says, one in flight (SPEC 3.5), and
 * finds the request that a reply belongs to.
 */
export class Wire {
  session = NO_SESSION;
  /** Requests that were written again. */
  retries = 0;
  private line: ByteLine | null = null;
  private number = 0;
  private flight: LiveRequest | null = null;
  private cancelTick: Cancel = () => undefined;

  constructor(
    private readonly clock: Clock,
    /** Number of this driver's rig lease (SPEC 3.3); greater from the next greeting on when the lease was taken anew. */
    public epoch: number,
    /** After a repetition time has brought something new (a request was given up). */
    private readonly freed: () => void,
  ) {}

  get attached(): boolean {
    return this.line !== null;
  }

  /** What is to be said of the line itself. */
  get lineRemark(): string | null {
    return this.line?.remark ?? null;
  }

  get inFlight(): LiveRequest | null {
    return this.flight;
  }

  /** A fresh line. The empty line ends whatever the other side had half received (SPEC 1.5). */
  attach(line: ByteLine): void {
    this.line = line;
    this.session = NO_SESSION;
    line.write('\n');
  }

  /** The line is gone; what was in flight is cut off. */
  async detach(): Promise<void> {
    const line = this.line;
    this.line = null;
    this.session = NO_SESSION;
    this.cutOff();
    await line?.close();
  }

  openSession(session: string): void {
    this.session = session;
    this.number = 0;
  }

  /** The controller knows the session no more. */
  cutOff(): void {
    if (this.flight !== null) this.input(this.flight, { kind: 'cut-off' });
  }

  /** Makes way for a stop. */
  overtake(): void {
    if (this.flight !== null) this.input(this.flight, { kind: 'overtaken' });
  }

  send(request: LiveRequest): void {
    const order = request.compose();
    this.number = (this.number + 1) & NUMBER_MASK;
    const session = order.word === 'hello' ? NO_SESSION : this.session;
    const line = encode({ kind: 'request', epoch: this.epoch, session, number: this.number, order });
    request.sent = { session, number: this.number, line, atMs: this.clock.monotonicMs(), attempts: 0 };
    this.flight = request;
    this.input(request, { kind: 'send', nowMs: request.sent.atMs });
  }

  /** The request in flight to which a reply belongs; null for the reply to one that was given up. */
  requestOf(reply: Reply): LiveRequest | null {
    const sent = this.flight?.sent;
    return sent?.session === reply.session && sent.number === reply.number ? this.flight : null;
  }

  /** Gives an input to the life of a request, in flight or not, and does what follows from it. */
  input(request: LiveRequest, input: CommandInput, reply: Reply | null = null): void {
    const { life, effects } = advanceCommand(request.life, request.of, input);
    request.life = life;
    for (const effect of effects) {
      if (effect === 'write') this.write(request);
      else request.told(effect, reply);
    }
    if (this.flight === request) this.watch(request);
  }

  private watch(request: LiveRequest): void {
    this.cancelTick();
    this.cancelTick = () => undefined;
    if (request.life.phase !== 'sent') {
      this.flight = null;
      return;
    }
    this.cancelTick = this.clock.after(request.life.nextAtMs - this.clock.monotonicMs(), () => {
      // A timer may fire a little early by the clock that it is compared with; the life decides by the deadline itself.
      const nowMs = request.life.phase === 'sent' ? Math.max(request.life.nextAtMs, this.clock.monotonicMs()) : this.clock.monotonicMs();
      this.input(request, { kind: 'tick', nowMs });
      this.freed();
    });
  }

  private write(request: LiveRequest): void {
    if (request.sent === null) return;
    request.sent.attempts += 1;
    if (request.sent.attempts > 1) this.retries += 1;
    this.line?.write(request.sent.line);
  }
}
