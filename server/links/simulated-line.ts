import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import type { ByteLine, ByteLineFactory, ByteLineHandlers } from '../interfaces/byte-line';
import type { Clock } from '../interfaces/clock';

export interface SimulatedLineSetting {
  clock: Clock;
  seed: number;
  /** What a host is told about the time of a byte, ms. */
  byteMs: number;
  /** Whether bytes take that time here; else whatever is behind the line spends it. */
  spendsByteTimes: boolean;
  description: string;
  /** A line has arrived at the controller. */
  toController: (line: string) => void;
}

const LEAST_NOISE_GAP_MS = 20;
const GREATEST_NOISE_GAP_MS = 120;
const GREATEST_NOISE_BYTES = 60;

/**
 * The line between the driver and a controller in memory, on the injected clock: every byte takes its
 * time on the wire, in each direction for itself; the line can be dead, noisy or slow for a while.
 */
export class SimulatedLine {
  readonly factory: ByteLineFactory;
  private handlers: ByteLineHandlers | null = null;
  private readonly byteMs: number;
  private readonly random;
  private rest = '';
  private outBusyMs = 0;
  private inBusyMs = 0;
  private deadUntilMs = -Infinity;
  private noisyUntilMs = -Infinity;
  private frozenUntilMs = -Infinity;
  private missing = false;

  constructor(private readonly setting: SimulatedLineSetting) {
    const { byteMs, spendsByteTimes, description, seed } = setting;
    this.byteMs = spendsByteTimes ? byteMs : 0;
    this.random = xoroshiro128plus(seed);
    this.factory = { description, byteTimeMs: byteMs, open: (handlers) => this.open(handlers) };
  }

  /** A line of the controller whose first byte goes out at `atMs` of the clock's monotonic time, or as soon as the wire is free. */
  fromController(line: string, atMs: number): void {
    const { clock } = this.setting;
    this.inBusyMs = Math.max(this.inBusyMs, atMs, clock.monotonicMs()) + line.length * this.byteMs;
    const arrivesMs = Math.max(this.inBusyMs, this.frozenUntilMs);
    const receiver = this.handlers;
    clock.after(arrivesMs - clock.monotonicMs(), () => {
      if (receiver !== null && receiver === this.handlers && !this.dead()) receiver.onLine(this.through(line.slice(0, -1)));
    });
  }

  /** Bytes in both directions vanish for so long. */
  drop(ms: number): void {
    this.deadUntilMs = this.setting.clock.monotonicMs() + ms;
  }

  /** Noise for so long: lines are spoilt in both directions and nonsense arrives between them. */
  garble(ms: number): void {
    this.noisyUntilMs = this.setting.clock.monotonicMs() + ms;
    this.chatter();
  }

  /** Bytes are kept back for so long, then come all at once. */
  freeze(ms: number): void {
    this.frozenUntilMs = this.setting.clock.monotonicMs() + ms;
  }

  /** The port disappears (or comes back): the open line closes, opening fails. */
  setMissing(missing: boolean): void {
    this.missing = missing;
    if (!missing) return;
    const handlers = this.handlers;
    this.handlers = null;
    handlers?.onClosed('the simulated port has disappeared');
  }

  private async open(handlers: ByteLineHandlers): Promise<ByteLine> {
    if (this.missing) throw new Error(`${this.setting.description} is not there; plug the controller in`);
    if (this.handlers !== null) throw new Error(`${this.setting.description} is in use already; close it there first`);
    this.handlers = handlers;
    this.rest = '';
    return {
      write: (bytes) => {
        if (this.handlers === handlers) this.write(bytes);
      },
      close: () => {
        if (this.handlers === handlers) this.handlers = null;
      },
    };
  }

  private write(bytes: string): void {
    const { clock } = this.setting;
    let from = 0;
    for (let end = bytes.indexOf('\n'); end >= 0; end = bytes.indexOf('\n', from)) {
      const line = this.rest + bytes.slice(from, end);
      this.outBusyMs = Math.max(this.outBusyMs, clock.monotonicMs()) + (end + 1 - from) * this.byteMs;
      this.rest = '';
      from = end + 1;
      const delayMs = Math.max(this.outBusyMs, this.frozenUntilMs) - clock.monotonicMs();
      if (delayMs > 0) clock.after(delayMs, () => this.arrive(line));
      else this.arrive(line);
    }
    this.rest += bytes.slice(from);
  }

  private arrive(line: string): void {
    if (!this.dead()) this.setting.toController(this.through(line));
  }

  private dead(): boolean {
    return this.setting.clock.monotonicMs() < this.deadUntilMs;
  }

  private noisy(): boolean {
    return this.setting.clock.monotonicMs() < this.noisyUntilMs;
  }

  /** The line as it arrives: with a spoilt byte while there is noise. */
  private through(line: string): string {
    if (line.length === 0 || !this.noisy()) return line;
    const place = uniformInt(this.random, 0, line.length - 1);
    return line.slice(0, place) + String.fromCharCode(uniformInt(this.random, 0x80, 0xff)) + line.slice(place + 1);
  }

  private chatter(): void {
    this.setting.clock.after(uniformInt(this.random, LEAST_NOISE_GAP_MS, GREATEST_NOISE_GAP_MS), () => {
      if (!this.noisy()) return;
      const bytes = Array.from({ length: uniformInt(this.random, 1, GREATEST_NOISE_BYTES) }, () =>
        String.fromCharCode(uniformInt(this.random, 0x0e, 0xff)),
      );
      this.handlers?.onLine(bytes.join(''));
      this.chatter();
    });
  }
}
