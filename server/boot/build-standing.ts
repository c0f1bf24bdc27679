import { join } from 'node:path';
import type { Logger } from 'pino';
import { Arming } from '../engine/arming';
import type { GuidedMoves } from '../engine/guided-moves';
import type { RigSupervisor } from '../engine/rig-supervisor';
import { sha256Hex } from '../evaluation/sha256';
import type { PersonalLock } from '../interfaces/lock-keeper';
import type { RigStation } from '../interfaces/rig-stations';
import { MemoryArmKeeper } from './arm-keeper';
import type { Background } from './background';
import type { BuildParts } from './build-parts';
import { MemoryLockKeeper } from './lock-keeper';
import { StandingFiles } from './standing-files';

export const engineItself = { id: null, name: 'the run engine' };

interface Around {
  log: Logger;
  background: Background;
  onLine(rigId: string): void;
  stationOf(rigId: string): RigStation | null;
  supervisor(): RigSupervisor;
  guided(): GuidedMoves;
}

/** Who answers for each rig, who is arming it, and whose hands are in it. */
export function buildStanding(
  parts: BuildParts,
  { log, background, onLine, stationOf, supervisor, guided }: Around,
): { arms: MemoryArmKeeper; arming: Arming; locks: MemoryLockKeeper } {
  const { engineDatabase: database = parts.database, clock, overrides = {} } = parts;
  const kept = {
    standing: overrides.standing ?? new StandingFiles(join(parts.config.stateDir, 'standing')),
    ...{ database, clock, log, sha256: sha256Hex, onChange: onLine },
    background: (work: Promise<unknown>, what: string) => background.add(work, what),
  };
  const arms = new MemoryArmKeeper(kept);
  const locks = new MemoryLockKeeper({ ...kept, onSet: layHandsOff });
  const arming = new Arming({
    clock,
    linkOf: (rigId) => stationOf(rigId)?.link ?? null,
    exitDelayMsOf: (rigId) => exitDelayMs(parts, stationOf(rigId)),
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

/** The exit delay of product.md: 2 min for every real rig. */
const exitDelayOfRealRigsMs = 120_000;

/** A rig that is part of this server has nobody in its room; how long its delay takes is configured. */
function exitDelayMs({ config, overrides = {} }: BuildParts, station: RigStation | null): number {
  return station?.virtual == null ? (overrides.exitDelayMs ?? exitDelayOfRealRigsMs) : 1000 * config.virtualExitDelayS;
}
