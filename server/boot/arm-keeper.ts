import type { Logger } from 'pino';
import type { ArmRequest } from '../engine/arming';
import type { ArmKeeper, EndedArm, StandingArm } from '../interfaces/arm-keeper';
import type { Clock } from '../interfaces/clock';
import type { ArmEnd, StandingEntry, StandingJournal } from '../interfaces/standing-journal';
import { armRig, currentArm, endArm, newestArm } from '../store/arms';
import { appendAudit } from '../store/audit';
import type { Connection } from '../store/database';
import { UntilStored } from './until-stored';

interface Parts {
  database: Connection;
  standing: StandingJournal;
  clock: Clock;
  log: Logger;
  sha256(text: string): string;
  /** Lets a write go on by itself; `idle` waits for it. */
  background(work: Promise<unknown>, what: string): void;
  onChange(rigId: string): void;
}

/** Arms in memory and in the database. Ending one takes effect here at once, whether or not the database answers. */
export class MemoryArmKeeper implements ArmKeeper {
  private readonly arms = new Map<string, StandingArm>();
  private readonly ended = new Map<string, EndedArm>();
  private readonly unstored: UntilStored<Extract<StandingEntry, { kind: 'arm-ended' }>>;

  constructor(private readonly parts: Parts) {
    this.unstored = new UntilStored({ ...parts, kind: 'arm-ended', what: 'the end of an arm', store: ({ end }) => this.store(end) });
  }

  /** Reads the arm of a rig that is taken up; an end that a process before this one could not store counts. */
  async load(rig: { labId: string; rigId: string }): Promise<void> {
    await this.unstored.settle(rig.rigId);
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
    const { labId, rigId } = rig;
    const atUtcMs = this.parts.clock.utcMs();
    this.ended.set(rigId, { name: arm.name, why, atUtcMs });
    this.parts.onChange(rigId);
    this.unstored.add({ kind: 'arm-ended', end: { armId: arm.id, labId, rigId, why, by: { id: by.id, name: by.name }, atUtcMs } });
  }

  kept(): Promise<void> {
    return this.unstored.kept();
  }

  close(): void {
    this.unstored.close();
  }

  private async store({ armId, labId, rigId, why, by, atUtcMs }: ArmEnd): Promise<void> {
    const { database, sha256 } = this.parts;
    await database.db.transaction(async (tx) => {
      const standing = await currentArm(tx, { labId, rigId, nowUtcMs: atUtcMs });
      if (standing?.id !== armId) return;
      await endArm(tx, { labId, rigId, nowUtcMs: atUtcMs, why });
      await appendAudit(tx, { labId, who: by, kind: 'rig.arm-ended', data: { rigId, why }, utcMs: atUtcMs }, sha256);
    });
  }
}
