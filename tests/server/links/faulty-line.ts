import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import type { ByteLineFactory } from '@/server/interfaces/byte-line';
import type { Clock } from '@/server/interfaces/clock';

export const lineFaults = ['drop', 'double', 'reorder', 'flip', 'truncate', 'delay', 'noise', 'merge', 'mixed'] as const;
export type LineFault = (typeof lineFaults)[number];

export interface FaultyLine {
  factory: ByteLineFactory;
  /** Lines as the controller truly sent them. */
  truth: { line: string; atMs: number }[];
  /** From now on every line passes as it is. */
  heal(): void;
}

interface FaultOptions {
  fault: LineFault;
  seed: number;
  /** Share of lines that are hit. */
  share: number;
}

/** A line that spoils a share of what passes, in both directions, and remembers what was true. */
export function faultyLine(inner: ByteLineFactory, clock: Clock, { fault, seed, share }: FaultOptions): FaultyLine {
  const random = xoroshiro128plus(seed);
  const upTo = (greatest: number) => uniformInt(random, 0, greatest);
  const truth: FaultyLine['truth'] = [];
  let healthy = false;

  /** A way for lines, in one direction. */
  function way(deliver: (line: string) => void): (line: string) => void {
    let held: string | null = null;
    const release = () => {
      if (held !== null) deliver(held);
      held = null;
    };
    const spoil: Record<Exclude<LineFault, 'mixed'>, (line: string) => void> = {
      drop: () => undefined,
      double: (line) => {
        deliver(line);
        deliver(line);
      },
      reorder: (line) => {
        held = line;
        clock.after(700, release);
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
        held = held === null ? line : held + line;
        clock.after(50, release);
      },
    };
    const kinds = Object.keys(spoil) as Exclude<LineFault, 'mixed'>[];
    return (line) => {
      const hit = !healthy && line.length > 0 && upTo(9_999) < share * 10_000;
      if (hit) return spoil[fault === 'mixed' ? (kinds[upTo(kinds.length - 1)] as Exclude<LineFault, 'mixed'>) : fault](line);
      deliver(line);
      release();
    };
  }

  const factory: ByteLineFactory = {
    ...inner,
    open: async ({ onLine, onClosed }) => {
      const inbound = way(onLine);
      const line = await inner.open({
        onLine: (text) => {
          truth.push({ line: text, atMs: clock.monotonicMs() });
          inbound(text);
        },
        onClosed,
      });
      const outbound = way((text) => line.write(`${text}\n`));
      return { write: (bytes) => outbound(bytes.slice(0, -1)), close: () => line.close() };
    },
  };
  return { factory, truth, heal: () => void (healthy = true) };
}
