import type { Logger } from 'pino';
import type { Cancel, Clock } from '../interfaces/clock';
import type { Connection } from '../store/database';
import { giveRigLeases, leasesOf, raiseRigEpoch, renewRigLeases, takeRigLease } from '../store/rig-leases';

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

/**
 * Leases of the rigs that this process drives: no rig has two drivers. It waits for those that another process has, each by itself, and
 * takes them over when their lease has run out, or at once where their process is known to have ended.
 */
export class LeaseKeeper {
  private readonly epochs = new Map<string, RigKey & { epoch: number }>();
  private readonly waitedFor = new Map<string, RigKey>();
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
    const { database, clock, holder } = this.parts;
    this.epochs.clear();
    // Where they could not be given back, the mark lets the next process take them once this one has ended.
    const given = await giveRigLeases(database.db, { holder, nowUtcMs: clock.utcMs() }).then(
      () => true,
      () => false,
    );
    if (given) this.parts.processes.forget(holder);
  }

  /** `gone`: the driver that is known to have ended; found out here where it is not given. */
  private async tryTake(rig: RigKey, gone?: string): Promise<boolean> {
    const { database, clock, holder, leaseMs } = this.parts;
    const { labId, rigId } = rig;
    const nowUtcMs = clock.utcMs();
    const lease = { labId, rigId, holder, nowUtcMs, untilUtcMs: nowUtcMs + leaseMs };
    const epoch = await takeRigLease(database.db, { ...lease, gone: gone ?? null });
    if (epoch === null && gone === undefined) {
      const [other] = await leasesOf(database.db, [rigId]);
      return other !== undefined && this.parts.processes.isGone(other.holder) && this.tryTake(rig, other.holder);
    }
    if (epoch === null || this.closed) return false;
    this.epochs.set(rigId, { labId, rigId, epoch });
    return true;
  }

  private waitFor({ labId, rigId }: RigKey): void {
    this.parts.log.warn({ rigId }, 'another server drives the rig; this one takes it over when it ends or its lease has run out');
    this.waitedFor.set(rigId, { labId, rigId });
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
      const nowUtcMs = clock.utcMs();
      for (const { rigId, holder, untilUtcMs } of await leasesOf(database.db, [...this.waitedFor.keys()])) {
        const rig = this.waitedFor.get(rigId);
        const gone = untilUtcMs > nowUtcMs && this.parts.processes.isGone(holder) ? holder : undefined;
        if (rig === undefined || (untilUtcMs > nowUtcMs && gone === undefined) || !(await this.tryTake(rig, gone))) continue;
        this.waitedFor.delete(rigId);
        log.warn(
          { rigId, epoch: this.epochs.get(rigId)?.epoch },
          `the other server ${gone === undefined ? 'let its lease run out' : 'has ended'}; this one takes the rig over`,
        );
        this.parts.onTaken(rig);
      }
    } catch (error) {
      log.debug({ err: error }, 'the leases of rigs could not be looked at');
    }
  }

  /** A database that does not answer takes no lease away: nobody else can get it there either. */
  private async renew(): Promise<void> {
    const { database, clock, log, holder, leaseMs } = this.parts;
    if (this.epochs.size === 0) return;
    const held = [...this.epochs.values()];
    this.expectAnswer();
    try {
      const renewed = await renewRigLeases(database.db, { holder, untilUtcMs: clock.utcMs() + leaseMs });
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
