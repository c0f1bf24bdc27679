import type { Logger } from 'pino';
import type { ArmRequest } from '../engine/arming';
import type { ArmKeeper, EndedArm, StandingArm } from '../interfaces/arm-keeper';
import type { Clock } from '../interfaces/clock';
import { armRig, currentArm, endArm, newestArm } from '../store/arms';
import { appendAudit } from '../store/audit';
import type { Connection } from '../store/database';

interface Parts {
  database: Connection;
  clock: Clock;
  log: Logger;
  sha256(text: string): string;
  /** Lets a write go on by itself; `idle` waits for it. */
  background(work: Promise<unknown>, what: string): void;
  onChange(rigId: string): void;
}

const retryMs = 5_000;

/** Arms in memory and in the database. Ending one takes effect here at once, whether or not the database answers. */
export class MemoryArmKeeper implements ArmKeeper {
  private readonly arms = new Map<string, StandingArm>();
  private readonly ended = new Map<string, EndedArm>();
  private closed = false;

  constructor(private readonly parts: Parts) {}

  /** Reads the arm of a rig that is taken up. */
  async load(rig: { labId: string; rigId: string }): Promise<void> {
    const arm = await newestArm(this.parts.database.db, rig);
    if (arm === null) return;
    const { id, name, note, fromAt: fromUtcMs, untilAt: untilUtcMs, bootId, endedAt, endedWhy } = arm;
    if (endedAt === null) {
      this.arms.set(rig.rigId, { id, name, note, fromUtcMs, untilUtcMs, bootId });
      return;
    }
    this.arms.delete(rig.rigId);
    this.ended.set(rig.rigId, { name, why: endedWhy ?? '', atUtcMs: endedAt });
  }

  armOf(rigId: string): StandingArm | null {
    const arm = this.arms.get(rigId);
    return arm !== undefined && arm.untilUtcMs > this.parts.clock.utcMs() ? arm : null;
  }

  endedOf(rigId: string): EndedArm | null {
    if (this.armOf(rigId) !== null) return null;
    const arm = this.arms.get(rigId);
    return arm === undefined ? (this.ended.get(rigId) ?? null) : { name: arm.name, why: 'its time was over', atUtcMs: arm.untilUtcMs };
  }

  /** The key was turned, the exit delay is over and the door is closed: stored with its entry in the audit chain, then it stands. */
  async arm(request: ArmRequest, bootId: string): Promise<void> {
    const { database, clock, sha256 } = this.parts;
    const { labId, rigId, name, note, untilUtcMs, by } = request;
    const nowUtcMs = clock.utcMs();
    const stored = await database.db.transaction(async (tx) => {
      const data = { rigId, name, until: new Date(untilUtcMs).toISOString() };
      await appendAudit(tx, { labId, who: by, kind: 'rig.armed', data, utcMs: nowUtcMs }, sha256);
      return armRig(tx, { labId, rigId, name, note, armedById: by.id, bootId, nowUtcMs, untilUtcMs });
    });
    this.arms.set(rigId, { id: stored.id, name, note, fromUtcMs: stored.fromAt, untilUtcMs: stored.untilAt, bootId });
    this.parts.onChange(rigId);
  }

  /** An arming came to nothing. */
  notArmed({ labId, rigId, name, by }: ArmRequest, why: string): void {
    const { database, clock, sha256 } = this.parts;
    const utcMs = clock.utcMs();
    this.arms.delete(rigId);
    this.ended.set(rigId, { name, why, atUtcMs: utcMs });
    const fact = { labId, who: by, kind: 'rig.not-armed', data: { rigId, name, why }, utcMs };
    this.parts.background(
      database.db.transaction((tx) => appendAudit(tx, fact, sha256)),
      'an entry of the audit chain',
    );
  }

  end(rig: { labId: string; rigId: string }, why: string, by: { id: string | null; name: string }): void {
    const arm = this.armOf(rig.rigId);
    if (arm === null) return;
    this.arms.delete(rig.rigId);
    this.ended.set(rig.rigId, { name: arm.name, why, atUtcMs: this.parts.clock.utcMs() });
    this.parts.onChange(rig.rigId);
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
