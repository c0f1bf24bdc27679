import { decodeLine, encode, NO_SESSION, type EventMessage, type OkBody, type Order, type Reply } from '@/firmware-protocol/codec';
import type { MachineSetting } from '@/server/links/machine-setting';
import { SimulatedMachine } from '@/server/links/simulated-machine';

export const limits = { least: -1700, greatest: 1700, speed: 300_000, acceleration: 600_000, home: 100_000 };
const MS = 1000;

/** Speaks with the machine directly, at times that a test chooses. */
export class MachinePeer {
  readonly sent: { line: string; atUs: number }[] = [];
  readonly machine: SimulatedMachine;
  session = NO_SESSION;
  number = 0;
  nowMs = 0;
  private tags = 0;

  constructor(options: Partial<Pick<MachineSetting, 'limits' | 'homed' | 'warned' | 'startSteps' | 'backlashSteps' | 'turnSteps'>> = {}) {
    const setting = {
      limits: options.limits ?? limits,
      startSteps: options.startSteps ?? 0,
      homed: options.homed ?? true,
      backlashSteps: options.backlashSteps ?? 0,
      turnSteps: options.turnSteps ?? null,
      warned: options.warned ?? true,
      bootCount: 0x1a2b,
      uptimeUs: 60e6,
      version: { major: 1, minor: 0 },
      firmware: 'simulated',
    };
    this.machine = new SimulatedMachine(setting, (line, atUs) => this.sent.push({ line, atUs }));
  }

  get us(): number {
    return this.nowMs * MS;
  }

  pass(ms: number): this {
    this.nowMs += ms;
    this.machine.runTo(this.us);
    return this;
  }

  /** Sends bytes as they are; the lines that were sent because of them. */
  put(line: string): string[] {
    const before = this.sent.length;
    this.machine.receive(line.replace(/\n$/, ''), this.us);
    return this.sent.slice(before).map((entry) => entry.line.slice(0, -1));
  }

  ask(order: Order, options: { number?: number; epoch?: number; session?: string } = {}): Reply {
    return this.put(this.text(order, options))
      .map(decodeLine)
      .find((item): item is Reply => item.kind === 'reply') as Reply;
  }

  text(order: Order, { number, epoch = 7, session }: { number?: number; epoch?: number; session?: string } = {}): string {
    if (number === undefined && order.word !== 'hello') this.number += 1;
    return encode({
      kind: 'request',
      epoch,
      session: session ?? (order.word === 'hello' ? NO_SESSION : this.session),
      number: number ?? this.number,
      order,
    });
  }

  /** Opens a session and renews the lease. */
  greet(epoch = 7): this {
    const { body } = this.ask({ word: 'hello', major: 1, minor: 0 }, { number: 9, epoch });
    if (body.word === 'hi') this.session = body.session;
    this.number = 0;
    this.renew();
    return this;
  }

  renew(): OkBody {
    return this.ask({ word: 'renew' }).body as OkBody;
  }

  status(): OkBody {
    return this.ask({ word: 'status' }).body as OkBody;
  }

  tag(): string {
    this.tags += 1;
    return this.tags.toString(16).toUpperCase().padStart(8, '0');
  }

  /** A move at the caps; `beginMs` from now, or now. */
  move(position: number, beginMs: number | null = null, tag = this.tag()): Order {
    return {
      word: 'move',
      tag,
      position,
      speed: limits.speed,
      acceleration: limits.acceleration,
      beginUs: beginMs === null ? null : 60e6 + this.us + beginMs * MS,
    };
  }

  /** Lets time pass with the lease kept. */
  passRenewing(ms: number): this {
    for (let left = ms; left > 0; left -= 500) {
      this.renew();
      this.pass(Math.min(500, left));
    }
    return this;
  }

  events(): EventMessage[] {
    return this.sent.map(({ line }) => decodeLine(line.slice(0, -1))).filter((item): item is EventMessage => item.kind === 'event');
  }

  /** What happened, in the words of the protocol, without tags. */
  happened(): string[] {
    return this.events().map(({ what }) =>
      Object.entries(what)
        .filter(([key]) => key !== 'tag')
        .map(([, value]) => value)
        .join(' '),
    );
  }
}
