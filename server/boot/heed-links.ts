import type { Logger } from 'pino';
import type { RunStart } from '@/shared/archive/run-records';
import type { Arming } from '../engine/arming';
import { endOfArm, knownAfter } from '../engine/end-of-arm';
import type { GuidedMoves } from '../engine/guided-moves';
import type { KeyTurns } from '../engine/key-turns';
import type { MotorSoak } from '../engine/motor-soak';
import type { SupervisorParts } from '../engine/rig-supervisor';
import type { NoticeTopic } from '../engine/run-context';
import type { LinkEvent, TurntableLink } from '../interfaces/turntable-link';
import type { MemoryArmKeeper } from './arm-keeper';
import { engineItself } from './build-standing';

interface Line {
  labId: string;
  rigId: string;
  link: TurntableLink;
}

interface Heeding {
  arms: MemoryArmKeeper;
  arming: Arming;
  guided: GuidedMoves;
  soak: MotorSoak;
  keyTurns: KeyTurns;
}

interface Wiring<S> {
  log: Logger;
  nowUtcMs(): number;
  /** What a line told, and whether the rig was armed just before. */
  onLinkEvent(station: S, event: LinkEvent, wasArmed: boolean): void;
}

/** What each line tells: whatever lets people or surprises into the room, or loses the position, ends the arm, run or no run. */
export function heedLinks<S extends Line>({ arms, arming, guided, soak, keyTurns }: Heeding, { log, onLinkEvent, nowUtcMs }: Wiring<S>) {
  const known = new Map<string, boolean>();
  return (station: S, event: LinkEvent): void => {
    const wasKnown = known.get(station.rigId) ?? false;
    const wasArmed = arms.armOf(station.rigId) !== null;
    const why = endOfArm(event, { wasKnown, arm: arms.armOf(station.rigId) });
    known.set(station.rigId, knownAfter(event, wasKnown));
    if (why !== null) arms.end(station, why, engineItself);
    if (event.kind === 'clock-stepped') log.warn({ rigId: station.rigId, clock: event.clock, byMs: event.byMs }, 'a clock stepped');
    soak.note(station.rigId, station.link.controller(), nowUtcMs());
    keyTurns.heard(station.rigId, event);
    arming.heard(station.rigId, event);
    guided.heard(station.rigId, event);
    onLinkEvent(station, event, wasArmed);
  };
}

/** What the runs ask for beside their commands to the controller. */
export const performing =
  (arms: MemoryArmKeeper, onNotice: (start: RunStart, notice: { topic: NoticeTopic; text: string }) => void): SupervisorParts['perform'] =>
  (effect, start) => {
    if (effect.kind === 'void-arm') arms.end({ labId: start.labId, rigId: start.rigId }, effect.reason, engineItself);
    else onNotice(start, effect);
  };
