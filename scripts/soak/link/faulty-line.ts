import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import type { ByteLine, ByteLineFactory } from '@/server/interfaces/byte-line';
import type { Clock } from '@/server/interfaces/clock';
import { Refusals } from './refusals';

/** What may happen to a line of bytes on its way; `mixed` is any of those before it. */
export const lineFaults = ['drop', 'double', 'reorder', 'flip', 'truncate', 'delay', 'noise', 'merge', 'mixed'] as const;
/** What hits only what the controller says: its replies, its events, bytes that another program reads away, and another device that talks in between. */
const inboundFaults = ['reply-lost', 'event-lost', 'stolen', 'talker'] as const;
/** What hits only what the driver asks. */
const outboundFaults = ['refused'] as const;
export type LineFault = (typeof lineFaults)[number] | (typeof inboundFaults)[number] | (typeof outboundFaults)[number];

export interface FaultyLine {
  factory: ByteLineFactory;
  /** From now on every line passes as it is. */
  heal(): void;
  /** Another program on the port writes a line, line feed included. */
  interject(line: string): void;
  /** Lines as somebody wrote them, at either end. */
  readonly written: ReadonlySet<string>;
  /** Lines as they came out, at either end. */
  readonly arrived: readonly string[];
}

/** Lines of devices that speak something else (made up). */
const FOREIGN = ['$GPX,17,04', 'T=21.4C', 'OK', '0x3f 0x11', 'e 3 boot', 'r 1 2 3 ok'];

interface FaultOptions {
  fault: LineFault;
  seed: number;
  /** Share of lines that are hit. */
  share: number;
}

/** A line that is kept back for a while. */
class Held {
  private line: string | null = null;

  constructor(private readonly deliver: (line: string) => void) {}

  keep(line: string): void {
    this.line = line;
  }

  join(line: string): void {
    this.line = (this.line ?? '') + line;
  }

  readonly release = (): void => {
    const { line } = this;
    this.line = null;
    if (line !== null) this.deliver(line);
  };
}

interface Way {
  clock: Clock;
  refusals: Refusals;
  noted(line: string): string;
  upTo(greatest: number): number;
  deliver(line: string): void;
  held: Held;
}

function spoilers({ clock, refusals, noted, upTo, deliver, held }: Way): Record<Exclude<LineFault, 'mixed'>, (line: string) => void> {
  return {
    refused: (line) => deliver(noted(refusals.askedInstead(line))),
    'reply-lost': (line) => (line.startsWith('r ') ? undefined : deliver(line)),
    'event-lost': (line) => (line.startsWith('e ') ? undefined : deliver(line)),
    stolen: (line) => {
      const from = upTo(line.length - 1);
      held.join(line.slice(0, from));
      clock.after(400, held.release);
    },
    talker: (line) => {
      deliver(FOREIGN[upTo(FOREIGN.length - 1)] as string);
      deliver(line);
    },
    drop: () => undefined,
    double: (line) => {
      deliver(line);
      deliver(line);
    },
    reorder: (line) => {
      held.keep(line);
      clock.after(700, held.release);
    },
    flip: (line) => {
      const place = upTo(line.length - 1);
      deliver(line.slice(0, place) + String.fromCharCode(line.charCodeAt(place) ^ (1 << upTo(7))) + line.slice(place + 1));
    },
    truncate: (line) => deliver(line.slice(0, upTo(line.length - 1))),
    delay: (line) => void clock.after(upTo(1500), () => deliver(line)),
    noise: (line) => {
      deliver(Array.from({ length: 1 + upTo(40) }, () => String.fromCharCode(0x20 + upTo(0xdf))).join(''));
      deliver(line);
    },
    merge: (line) => {
      held.join(line);
      clock.after(50, held.release);
    },
  };
}

/** A line that spoils a share of what passes, in both directions or, for some faults, in one. */
export function faultyLine(inner: ByteLineFactory, clock: Clock, { fault, seed, share }: FaultOptions): FaultyLine {
  const random = xoroshiro128plus(seed);
  const upTo = (greatest: number) => uniformInt(random, 0, greatest);
  const mixable = lineFaults.filter((kind) => kind !== 'mixed');
  const refusals = new Refusals(upTo);
  const written = new Set<string>();
  const arrived: string[] = [];
  let healthy = false;
  let current: ByteLine | null = null;
  const noted = (line: string) => {
    written.add(line);
    return line;
  };

  /** A way for lines, in one direction. */
  function way(deliver: (line: string) => void, isInbound: boolean): (line: string) => void {
    const held = new Held(deliver);
    const spoil = spoilers({ clock, refusals, noted, upTo, deliver, held });
    const spared: readonly string[] = isInbound ? outboundFaults : inboundFaults;
    const spares = spared.includes(fault);
    return (line) => {
      const hit = !healthy && !spares && line.length > 0 && upTo(9_999) < share * 10_000;
      if (hit) return spoil[fault === 'mixed' ? (mixable[upTo(mixable.length - 1)] as Exclude<LineFault, 'mixed'>) : fault](line);
      deliver(line);
      held.release();
    };
  }

  const arriving = (deliver: (line: string) => void) => (line: string) => {
    arrived.push(line);
    deliver(line);
  };

  const factory: ByteLineFactory = {
    ...inner,
    open: async ({ onLine, onClosed }) => {
      const inbound = way(arriving(onLine), true);
      const line = (current = await inner.open({ onLine: (text) => inbound(noted(refusals.answeredInstead(text))), onClosed }));
      const outbound = way(
        arriving((text) => line.write(`${text}\n`)),
        false,
      );
      return { write: (bytes) => outbound(noted(bytes.slice(0, -1))), close: () => line.close() };
    },
  };
  const interject = (line: string) => current?.write(line);
  return { factory, heal: () => void (healthy = true), interject, written, arrived };
}
