import type { Reply } from '@/firmware-protocol/codec';
import type { Clock } from '../interfaces/clock';
import type { ClockModel } from './clock-model';
import type { LiveRequest } from './wire';

/** Round trips that the percentiles are taken of. */
const KEPT_ROUND_TRIPS = 100;

/** What the exchanges on a line tell: the controller's clock, and how long an answer takes. */
export class LinkMetrics {
  private readonly roundTripsMs: number[] = [];

  constructor(
    private readonly clock: Clock,
    private readonly model: ClockModel,
    private readonly byteTimeMs: number,
  ) {}

  /** An answered request. A stored reply has the stamps of the first receipt (SPEC 6.3) and tells nothing. */
  measure({ sent }: LiveRequest, { receivedUs, turnUs, body }: Reply, bytes: number): void {
    if (sent === null || sent.attempts !== 1 || body.word === 'no') return;
    const t4Ms = this.clock.monotonicMs();
    this.roundTripsMs.push(t4Ms - sent.atMs);
    if (this.roundTripsMs.length > KEPT_ROUND_TRIPS) this.roundTripsMs.shift();
    const [outMs, inMs] = [sent.line.length * this.byteTimeMs, bytes * this.byteTimeMs];
    this.model.add({ t1Ms: sent.atMs, t2Us: receivedUs, t3Us: receivedUs + turnUs, t4Ms, outMs, inMs });
  }

  /** Of the last answer; null before the first. */
  get roundTripMs(): number | null {
    return this.roundTripsMs.at(-1) ?? null;
  }
}
