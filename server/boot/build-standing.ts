import type { Logger } from 'pino';
import { Arming } from '../engine/arming';
import type { GuidedMoves } from '../engine/guided-moves';
import type { RigSupervisor } from '../engine/rig-supervisor';
import type { Clock } from '../interfaces/clock';
import type { PersonalLock } from '../interfaces/lock-keeper';
import type { StandingJournal } from '../interfaces/standing-journal';
import type { StandingStore } from '../interfaces/standing-store';
import type { TurntableLink } from '../interfaces/turntable-link';
import { MemoryArmKeeper } from './arm-keeper';
import type { Background } from './background';
import { MemoryLockKeeper } from './lock-keeper';

export const engineItself = { id: null, name: 'the run engine' };

export interface StandingParts {
  store: StandingStore;
  /** Keeps what the database has still to learn. */
  standing: StandingJournal;
  clock: Clock;
  log: Logger;
  background: Background;
  newId(): string;
  onLine(rigId: string): void;
  linkOf(rigId: string): TurntableLink | null;
  exitDelayMsOf(rigId: string): number;
  supervisor(): RigSupervisor;
  guided(): GuidedMoves;
}

/** Who answers for each rig, who is arming it, and whose hands are in it. */
export interface Standing {
  arms: MemoryArmKeeper;
  arming: Arming;
  locks: MemoryLockKeeper;
}

export function buildStanding(parts: StandingParts): Standing {
  const { store, standing, clock, log, newId, background, onLine, linkOf, exitDelayMsOf, supervisor, guided } = parts;
  const kept = {
    ...{ store, standing, clock, log, onChange: onLine },
    background: (work: Promise<unknown>, what: string) => background.add(work, what),
  };
  const arms = new MemoryArmKeeper(kept);
  const locks = new MemoryLockKeeper({ ...kept, newId, onSet: layHandsOff });
  const arming = new Arming({
    ...{ clock, linkOf, exitDelayMsOf },
    lockedBy: (rigId) => locks.lockedBy(rigId),
    arm: (request, bootId) => {
      const storing = arms.arm(request, bootId);
      background.add(storing, 'storing an arm');
      return storing;
    },
    endArm: (request, why) => arms.end(request, why, engineItself),
    notArmed: (request, why) => arms.notArmed(request, why),
    onChange: onLine,
  });

  /** Somebody's hands are in the rig: whatever moves comes to rest at once, and nobody's arm stands. */
  function layHandsOff({ labId, rigId, userId, name }: PersonalLock): void {
    const by = { id: userId, name };
    const driver = supervisor().activeOf(rigId);
    if (driver === null || driver.isOver()) guided().halt({ labId, rigId }, 'hold', by);
    else driver.hold(`${name} (personal lock)`);
    arming.end(rigId, `${name} set a personal lock`);
    arms.end({ labId, rigId }, `${name} set a personal lock`, by);
  }

  return { arms, arming, locks };
}
