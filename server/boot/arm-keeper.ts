import type { Logger } from 'pino';
import type { ArmRequest } from '../engine/arming';
import type { ArmKeeper, EndedArm, StandingArm } from '../interfaces/arm-keeper';
import type { Clock } from '../interfaces/clock';
import type { StandingEntry, StandingJournal } from '../interfaces/standing-journal';
import type { StandingStore } from '../interfaces/standing-store';
import { UntilStored } from './until-stored';

interface Parts {
  store: StandingStore;
  standing: StandingJournal;
  clock: Clock;
  log: Logger;
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
    const store = ({ end }: Extract<StandingEntry, { kind: 'arm-ended' }>) => parts.store.endArm(end, end);
    this.unstored = new UntilStored({ ...parts, kind: 'arm-ended', what: 'the end of an arm', store });
  }

  /** Reads the arm of a rig that is taken up; an end that a process before this one could not store counts. */
  async load(rig: { labId: string; rigId: string }): Promise<void> {
    await this.unstored.settle(rig.rigId);
    const stored = await this.parts.store.newestArm(rig);
    if (stored === null) return;
    const { endedUtcMs, endedWhy, ...arm } = stored;
    if (endedUtcMs === null) {
      this.arms.set(rig.rigId, arm);
      return;
    }
    this.arms.delete(rig.rigId);
    this.ended.set(rig.rigId, { name: arm.name, why: endedWhy ?? '', atUtcMs: endedUtcMs });
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
  async arm({ labId, rigId, name, note, untilUtcMs, by }: ArmRequest, bootId: string): Promise<void> {
    const { store, clock } = this.parts;
    this.arms.set(rigId, await store.giveArm({ labId, rigId, name, note, fromUtcMs: clock.utcMs(), untilUtcMs, bootId, by }));
    this.parts.onChange(rigId);
  }

  /** An arming came to nothing. */
  notArmed({ labId, rigId, name, by }: ArmRequest, why: string): void {
    const { store, clock, background } = this.parts;
    const atUtcMs = clock.utcMs();
    this.arms.delete(rigId);
    this.ended.set(rigId, { name, why, atUtcMs });
    background(store.notArmed({ labId, rigId }, { name, why, by, atUtcMs }), 'an entry of the audit chain');
  }

  end({ labId, rigId }: { labId: string; rigId: string }, why: string, by: { id: string | null; name: string }): void {
    const arm = this.armOf(rigId);
    if (arm === null) return;
    const atUtcMs = this.parts.clock.utcMs();
    this.arms.delete(rigId);
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
}
