import type { Reply } from '@/firmware-protocol/codec';
import type { ByteLineFactory } from '../interfaces/byte-line';
import { type Clock, HOST_STEP_MS, wallUtcMs } from '../interfaces/clock';
import type { ClockExchange, ClockModel } from './clock-model';
import type { LinkHealth } from '../interfaces/turntable-link';
import type { LiveRequest } from './wire';

/** So many impossible exchanges in a row mean that the line does not keep to its rate, as boards with USB of their own do not. */
const IMPOSSIBLE_IN_A_ROW = 3;
const PPM = 1e6;
/** Round trips that the percentiles are taken of. */
const KEPT_ROUND_TRIPS = 100;

type MetricsHealth = Pick<
  LinkHealth,
  'roundTripMs' | 'roundTripP50Ms' | 'roundTripP95Ms' | 'clockOffsetMs' | 'clockUS' | 'driftPpm' | 'driftUPpm'
>;

export interface MetricsSetting {
  clock: Clock;
  model: ClockModel;
  factory: ByteLineFactory;
  /** A clock jumped by `byMs`. */
  stepped(clock: 'host' | 'controller', byMs: number): void;
}

/** What the exchanges on a line tell: the controller's clock, and how long an answer takes. */
export class LinkMetrics {
  private readonly roundTripsMs: number[] = [];
  private impossible = 0;
  /** UTC less monotonic time at the last look. */
  private aheadMs: number | null = null;

  constructor(private readonly setting: MetricsSetting) {}

  /** An answered request. A stored reply has the stamps of the first receipt (SPEC 6.3) and tells nothing. */
  measure({ sent }: LiveRequest, { receivedUs, turnUs, body }: Reply, bytes: number): void {
    if (sent === null || sent.attempts !== 1 || body.word === 'no') return;
    const t4Ms = this.setting.clock.monotonicMs();
    this.roundTripsMs.push(t4Ms - sent.atMs);
    if (this.roundTripsMs.length > KEPT_ROUND_TRIPS) this.roundTripsMs.shift();
    const exchange = { t1Ms: sent.atMs, t2Us: receivedUs, t3Us: receivedUs + turnUs, t4Ms };
    const steppedMs = this.setting.model.contradiction(exchange);
    if (steppedMs !== 0) {
      this.setting.model.forget();
      this.setting.stepped('controller', steppedMs);
    }
    const lengths = { out: sent.line.length, in: bytes };
    if (this.keepsRate) this.noteUse(this.add(exchange, lengths, this.setting.factory.byteTimeMs ?? 0));
    if (!this.keepsRate) this.add(exchange, lengths, 0);
  }

  private add(exchange: Omit<ClockExchange, 'outMs' | 'inMs'>, lengths: { out: number; in: number }, byteTimeMs: number): boolean {
    return this.setting.model.add({ ...exchange, outMs: lengths.out * byteTimeMs, inMs: lengths.in * byteTimeMs });
  }

  /** Looks at the host's two clocks; an ordinary correction slews by 0.5 ms a second at most (adjtimex, from memory). */
  watchHost(): void {
    const aheadMs = wallUtcMs(this.setting.clock) - this.setting.clock.monotonicMs();
    const byMs = this.aheadMs === null ? 0 : aheadMs - this.aheadMs;
    this.aheadMs = aheadMs;
    if (Math.abs(byMs) > HOST_STEP_MS) this.setting.stepped('host', byMs);
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
    if (!this.keepsRate) this.setting.model.forget();
  }

  /** The part of the link's health that exchanges tell. */
  health(): MetricsHealth {
    const { model, clock } = this.setting;
    const offset = model.known ? model.offsetAt(clock.monotonicMs()) : null;
    const { drift } = model;
    return {
      roundTripMs: this.roundTripsMs.at(-1) ?? null,
      roundTripP50Ms: this.quantileMs(0.5),
      roundTripP95Ms: this.quantileMs(0.95),
      clockOffsetMs: offset?.ms ?? null,
      clockUS: offset === null ? null : offset.uMs / 1000,
      driftPpm: drift === null ? null : drift.slope * PPM,
      driftUPpm: drift === null ? null : drift.uSlope * PPM,
    };
  }

  /** This share of the last round trips is not longer. */
  private quantileMs(share: number): number | null {
    const sorted = [...this.roundTripsMs].sort((a, b) => a - b);
    return sorted[Math.max(0, Math.ceil(share * sorted.length) - 1)] ?? null;
  }
}
