import type { Logger } from 'pino';
import type { Cancel, Clock } from '../interfaces/clock';
import type { Connection } from '../store/database';
import {
  giveRigLeases,
  leasesOf,
  raiseRigEpoch,
  renewRigLeases,
  takeRigLease,
  type SeenLease,
  type Takeable,
  wasGivenBack,
} from '../store/rig-leases';

export interface RigKey {
  labId: string;
  rigId: string;
}

export interface LeaseParts {
  database: Connection;
  clock: Clock;
  log: Logger;
  /** Name of this process. */
  holder: string;
  /** A crashed server's rigs are free again after this, ms. */
  leaseMs: number;
  /** Which processes are known to have ended, so that their leases need not run out. */
  processes: {
    isGone(holder: string): boolean;
    /** Nothing has to be known of it any more. */
    forget(holder: string): void;
  };
  /** A rig for which this process waited is its own now. */
  onTaken(rig: RigKey): void;
  /** Another process has taken a rig over: this one must let go of it at once. */
  onLost(rig: RigKey): void;
  /** Whether leases can be renewed: after the grace the database counts as away, since `sinceUtcMs`; null: it answers again. */
  onDatabase(sinceUtcMs: number | null): void;
  /** How long a renewal may go unanswered, ms. */
  graceMs: number;
}

/** So often within its length a lease is renewed. */
const renewals = 3;
const retryMs = 250;
/** Where more passes between two looks, this process or the database stood still, and so may have the driver's renewals: no more of it counts. */
const longestGapMs = 2 * retryMs;

/** A rig that another process has. */
interface Waiting extends RigKey {
  /** Its lease at the last look, asked for at `askedMs`; null before the first one. */
  seen: SeenLease | null;
  askedMs: number;
  /** Since when it stands so: the answer in which it was new, later by whatever does not count. */
  sinceMs: number;
}

/**
 * Leases of the rigs that this process drives: no rig has two drivers. It waits for those that another process has, each by itself, and
 * takes them over when their lease was not renewed for its length, by this process's monotonic time, or at once where their process is known to have
 * ended or gave them back. A driver believes in its lease until a renewal tells otherwise; where somebody else has the rig already, the controller
 * refuses its lower epoch and the database what it writes.
 */
export class LeaseKeeper {
  private readonly epochs = new Map<string, RigKey & { epoch: number }>();
  private readonly waitedFor = new Map<string, Waiting>();
  private readonly cancels: Partial<Record<'renew' | 'retry' | 'grace', Cancel>> = {};
  private closed = false;
  private away = false;
  private working: Promise<unknown> = Promise.resolve();

  constructor(private readonly parts: LeaseParts) {}

  /** The epoch under which this process drives a rig, taken now where nobody has it; null while another process drives it. */
  async epochOf(rig: RigKey): Promise<number | null> {
    if (!this.epochs.has(rig.rigId) && !this.closed && !(await this.tryTake(rig))) this.waitFor(rig);
    return this.epochs.get(rig.rigId)?.epoch ?? null;
  }

  /** Whether this process drives the rig. */
  holds(rigId: string): boolean {
    return this.epochs.has(rigId);
  }

  /** Labs whose rigs this process drives: their members must be able to hold, stop and lock without the database. */
  labIds(): string[] {
    return [...new Set([...this.epochs.values()].map(({ labId }) => labId))];
  }

  /** Whether this process drives the rig or waits for it. */
  knows(rigId: string): boolean {
    return this.epochs.has(rigId) || this.waitedFor.has(rigId);
  }

  /** Lifts this process's epoch of a rig above one that its controller has met elsewhere; null where it does not drive the rig. */
  async raise({ labId, rigId }: RigKey, above: number): Promise<number | null> {
    if (!this.epochs.has(rigId)) return null;
    const { database, holder } = this.parts;
    const epoch = await raiseRigEpoch(database.db, { labId, rigId, holder, above });
    if (epoch !== null) this.epochs.set(rigId, { labId, rigId, epoch });
    return epoch;
  }

  renewRegularly(): void {
    if (this.closed) return;
    this.cancels.renew = this.parts.clock.after(this.parts.leaseMs / renewals, () => {
      this.working = this.renew().then(() => this.renewRegularly());
    });
  }

  /** Resolves when no renewal is under way. */
  async idle(): Promise<void> {
    await this.working;
  }

  /** Gives all leases back, so that the next process need not wait. */
  async close(): Promise<void> {
    this.closed = true;
    for (const cancel of Object.values(this.cancels)) cancel();
    // A renewal that is still on its way would take again what is given back here.
    await this.working;
    const { database, holder } = this.parts;
    this.epochs.clear();
    // Where they could not be given back, the mark lets the next process take them once this one has ended.
    const given = await giveRigLeases(database.db, holder).then(
      () => true,
      () => false,
    );
    if (given) this.parts.processes.forget(holder);
  }

  private async tryTake(rig: RigKey, why?: Takeable): Promise<boolean> {
    const { database, holder, leaseMs, processes } = this.parts;
    const { labId, rigId } = rig;
    const epoch = await takeRigLease(database.db, { labId, rigId, holder, leaseMs, why });
    if (epoch === null && why === undefined) {
      const [other] = await leasesOf(database.db, [rigId]);
      return other !== undefined && processes.isGone(other.holder) && this.tryTake(rig, { gone: other.holder });
    }
    if (epoch === null || this.closed) return false;
    this.epochs.set(rigId, { labId, rigId, epoch });
    return true;
  }

  private waitFor({ labId, rigId }: RigKey): void {
    this.parts.log.warn({ rigId }, 'another server drives the rig; this one takes it over when it ends or its lease has run out');
    this.waitedFor.set(rigId, { labId, rigId, seen: null, askedMs: 0, sinceMs: 0 });
    this.retryRegularly();
  }

  private retryRegularly(): void {
    if (this.closed || this.waitedFor.size === 0 || this.cancels.retry !== undefined) return;
    this.cancels.retry = this.parts.clock.after(retryMs, () => {
      void this.retry().finally(() => {
        delete this.cancels.retry;
        this.retryRegularly();
      });
    });
  }

  private async retry(): Promise<void> {
    const { database, clock, log } = this.parts;
    try {
      const askedMs = clock.monotonicMs();
      for (const seen of await leasesOf(database.db, [...this.waitedFor.keys()])) {
        const { rigId } = seen;
        const rig = this.waitedFor.get(rigId);
        if (rig === undefined) continue;
        const why = this.whyTake(rig, seen, askedMs);
        if (why === null || !(await this.tryTake(rig, why))) continue;
        this.waitedFor.delete(rigId);
        log.warn(
          { rigId, epoch: this.epochs.get(rigId)?.epoch },
          `the other server ${'gone' in why ? 'has ended' : 'let its lease run out'}; this one takes the rig over`,
        );
        this.parts.onTaken(rig);
      }
    } catch (error) {
      log.debug({ err: error }, 'the leases of rigs could not be looked at');
    }
  }

  /** Why a rig that was waited for may be taken now; null where its driver may be alive. */
  private whyTake(rig: Waiting, lease: SeenLease, askedMs: number): Takeable | null {
    const { seen } = rig;
    const stands = seen !== null && seen.holder === lease.holder && seen.epoch === lease.epoch && seen.untilUtcMs === lease.untilUtcMs;
    rig.sinceMs = stands ? rig.sinceMs + Math.max(0, askedMs - rig.askedMs - longestGapMs) : this.parts.clock.monotonicMs();
    Object.assign(rig, { seen: lease, askedMs });
    if (wasGivenBack(lease) || this.parts.processes.isGone(lease.holder)) return { gone: lease.holder };
    return stands && askedMs - rig.sinceMs >= this.parts.leaseMs ? { still: lease } : null;
  }

  /** A database that does not answer takes no lease away: nobody else can get it there either. */
  private async renew(): Promise<void> {
    const { database, log, holder, leaseMs } = this.parts;
    if (this.epochs.size === 0) return;
    const held = [...this.epochs.values()];
    this.expectAnswer();
    try {
      const renewed = await renewRigLeases(database.db, { holder, leaseMs });
      this.answered();
      for (const { labId, rigId } of held) if (!renewed.has(rigId)) this.lose({ labId, rigId });
    } catch (error) {
      log.warn({ err: error }, 'the leases of the rigs could not be renewed');
    }
  }

  private lose(rig: RigKey): void {
    if (this.closed || !this.epochs.delete(rig.rigId)) return;
    this.parts.log.fatal({ rigId: rig.rigId }, 'another server has taken the rig over; this one lets go of it');
    this.parts.onLost(rig);
    this.waitFor(rig);
  }

  private expectAnswer(): void {
    if (this.cancels.grace !== undefined) return;
    const { clock, graceMs, onDatabase } = this.parts;
    const sinceUtcMs = clock.utcMs();
    this.cancels.grace = clock.after(graceMs, () => {
      this.away = true;
      onDatabase(sinceUtcMs);
    });
  }

  private answered(): void {
    this.cancels.grace?.();
    delete this.cancels.grace;
    if (!this.away) return;
    this.away = false;
    this.parts.onDatabase(null);
  }
}
