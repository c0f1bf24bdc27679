import type { Logger } from 'pino';
import type { ArmKeeper, StandingArm } from '../interfaces/arm-keeper';
import type { Clock } from '../interfaces/clock';
import { currentArm, endArm } from '../store/arms';
import { appendAudit } from '../store/audit';
import type { Connection } from '../store/database';

interface Parts {
  database: Connection;
  clock: Clock;
  log: Logger;
  sha256(text: string): string;
  /** Lets a write go on by itself; `idle` waits for it. */
  background(work: Promise<unknown>, what: string): void;
}

const retryMs = 5_000;

/** Arms in memory and in the database. Ending one takes effect here at once, whether or not the database answers. */
export class MemoryArmKeeper implements ArmKeeper {
  private readonly arms = new Map<string, StandingArm>();
  private closed = false;

  constructor(private readonly parts: Parts) {}

  /** Reads the arm of a rig that is taken up. */
  async load(rig: { labId: string; rigId: string }): Promise<void> {
    const arm = await currentArm(this.parts.database.db, { ...rig, nowUtcMs: this.parts.clock.utcMs() });
    if (arm === null) return;
    const { id, name, note, fromAt: fromUtcMs, untilAt: untilUtcMs, bootId } = arm;
    this.set(rig.rigId, { id, name, note, fromUtcMs, untilUtcMs, bootId });
  }

  armOf(rigId: string): StandingArm | null {
    const arm = this.arms.get(rigId);
    return arm !== undefined && arm.untilUtcMs > this.parts.clock.utcMs() ? arm : null;
  }

  set(rigId: string, arm: StandingArm): void {
    this.arms.set(rigId, arm);
  }

  end(rig: { labId: string; rigId: string }, why: string, by: { id: string | null; name: string }): void {
    const arm = this.armOf(rig.rigId);
    this.arms.delete(rig.rigId);
    if (arm === null) return;
    this.parts.background(this.store(rig, { armId: arm.id, why, by, atUtcMs: this.parts.clock.utcMs() }), 'the end of an arm');
  }

  close(): void {
    this.closed = true;
  }

  /** Tries until it is stored: an arm that ended must not stand again after a restart. */
  private async store(
    rig: { labId: string; rigId: string },
    end: { armId: string; why: string; by: { id: string | null; name: string }; atUtcMs: number },
  ): Promise<void> {
    const { database, clock, log, sha256 } = this.parts;
    while (!this.closed) {
      try {
        await database.db.transaction(async (tx) => {
          const standing = await currentArm(tx, { ...rig, nowUtcMs: end.atUtcMs });
          if (standing?.id !== end.armId) return;
          await endArm(tx, { ...rig, nowUtcMs: end.atUtcMs, why: end.why });
          await appendAudit(
            tx,
            { labId: rig.labId, who: end.by, kind: 'rig.arm-ended', data: { rigId: rig.rigId, why: end.why }, utcMs: end.atUtcMs },
            sha256,
          );
        });
        return;
      } catch (error) {
        log.warn({ err: error, rigId: rig.rigId }, 'the end of an arm is not stored yet');
        await new Promise<void>((resolve) => void clock.after(retryMs, resolve));
      }
    }
  }
}
