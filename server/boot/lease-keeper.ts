import type { Logger } from 'pino';
import type { Cancel, Clock } from '../interfaces/clock';
import type { Connection } from '../store/database';
import { giveRigLease, takeRigLease } from '../store/rig-leases';

export interface LeaseParts {
  database: Connection;
  clock: Clock;
  log: Logger;
  /** Name of this process. */
  holder: string;
  /** A crashed server's rigs are free again after this, ms. */
  leaseMs: number;
  /** Another process has taken a rig over: this one must let go of it at once. */
  onLost(rig: RigKey): void;
}

interface RigKey {
  labId: string;
  rigId: string;
}

/** So often within its length a lease is renewed. */
const renewals = 3;
const retryMs = 250;

/** Leases of the rigs that this process drives: no rig has two drivers. */
export class LeaseKeeper {
  private readonly epochs = new Map<string, RigKey & { epoch: number }>();
  private cancel: Cancel = () => undefined;
  private closed = false;
  private renewing: Promise<void> = Promise.resolve();

  constructor(private readonly parts: LeaseParts) {}

  /** The epoch under which this process drives a rig, taken now where nobody has it; null while another process drives it. */
  async epochOf(rig: RigKey): Promise<number | null> {
    const held = this.epochs.get(rig.rigId);
    if (held === undefined && !this.closed) await this.tryTake(rig);
    return this.epochs.get(rig.rigId)?.epoch ?? null;
  }

  /** Takes the lease of a rig, waiting until the one of a process that is gone has run out. False when closed before. */
  async take(rig: RigKey): Promise<boolean> {
    for (let told = false; !this.closed; told = true) {
      if (await this.tryTake(rig)) return true;
      if (!told) this.parts.log.warn(rig, 'another server holds the lease of the rig; waiting for its end');
      await new Promise<void>((resolve) => void this.parts.clock.after(retryMs, resolve));
    }
    return false;
  }

  renewRegularly(): void {
    this.cancel = this.parts.clock.after(this.parts.leaseMs / renewals, () => {
      this.renewing = this.renewAll().then(() => {
        if (!this.closed) this.renewRegularly();
      });
    });
  }

  /** Gives all leases back, so that the next process need not wait. */
  async close(): Promise<void> {
    this.closed = true;
    this.cancel();
    // A renewal that is still on its way would take again what is given back here.
    await this.renewing;
    const { database, clock, holder } = this.parts;
    for (const { labId, rigId } of this.epochs.values())
      await giveRigLease(database.db, { labId, rigId, holder, nowUtcMs: clock.utcMs() }).catch(() => undefined);
    this.epochs.clear();
  }

  private async tryTake(rig: RigKey): Promise<boolean> {
    const { database, clock, holder, leaseMs } = this.parts;
    const nowUtcMs = clock.utcMs();
    const epoch = await takeRigLease(database.db, { ...rig, holder, nowUtcMs, untilUtcMs: nowUtcMs + leaseMs });
    if (epoch === null) return false;
    this.epochs.set(rig.rigId, { ...rig, epoch });
    return true;
  }

  /** A database that does not answer takes no lease away: nobody else can get it there either. */
  private async renewAll(): Promise<void> {
    for (const { labId, rigId } of [...this.epochs.values()]) {
      try {
        if ((await this.tryTake({ labId, rigId })) || this.closed) continue;
        this.epochs.delete(rigId);
        this.parts.onLost({ labId, rigId });
      } catch (error) {
        this.parts.log.warn({ err: error, rigId }, 'the lease of a rig could not be renewed');
      }
    }
  }
}
