import type { Reply } from '@/firmware-protocol/codec';
import type { ByteLineFactory } from '../interfaces/byte-line';
import type { Clock } from '../interfaces/clock';
import type { ClockExchange, ClockModel } from './clock-model';
import type { LiveRequest } from './wire';

/** So many impossible exchanges in a row mean that the line does not keep to its rate, as boards with USB of their own do not. */
const IMPOSSIBLE_IN_A_ROW = 3;
/** Round trips that the percentiles are taken of. */
const KEPT_ROUND_TRIPS = 100;

/** What the exchanges on a line tell: the controller's clock, and how long an answer takes. */
export class LinkMetrics {
  private readonly roundTripsMs: number[] = [];
  private impossible = 0;

  constructor(
    private readonly clock: Clock,
    private readonly model: ClockModel,
    private readonly factory: ByteLineFactory,
  ) {}

  /** An answered request. A stored reply has the stamps of the first receipt (SPEC 6.3) and tells nothing. */
  measure({ sent }: LiveRequest, { receivedUs, turnUs, body }: Reply, bytes: number): void {
    if (sent === null || sent.attempts !== 1 || body.word === 'no') return;
    const t4Ms = this.clock.monotonicMs();
    this.roundTripsMs.push(t4Ms - sent.atMs);
    if (this.roundTripsMs.length > KEPT_ROUND_TRIPS) this.roundTripsMs.shift();
    const exchange = { t1Ms: sent.atMs, t2Us: receivedUs, t3Us: receivedUs + turnUs, t4Ms };
    const lengths = { out: sent.line.length, in: bytes };
    if (this.keepsRate) this.noteUse(this.add(exchange, lengths, this.factory.byteTimeMs ?? 0));
    if (!this.keepsRate) this.add(exchange, lengths, 0);
  }

  private add(exchange: Omit<ClockExchange, 'outMs' | 'inMs'>, lengths: { out: number; in: number }, byteTimeMs: number): boolean {
    return this.model.add({ ...exchange, outMs: lengths.out * byteTimeMs, inMs: lengths.in * byteTimeMs });
  }

  /** A fresh line, which may be another kind of port. */
  begin(): void {
    this.impossible = 0;
  }

  private get keepsRate(): boolean {
    return this.impossible < IMPOSSIBLE_IN_A_ROW;
  }

  private noteUse(used: boolean): void {
    this.impossible = used ? 0 : this.impossible + 1;
    if (!this.keepsRate) this.model.forget();
  }

  /** Of the last answer; null before the first. */
  get roundTripMs(): number | null {
    return this.roundTripsMs.at(-1) ?? null;
  }
}
