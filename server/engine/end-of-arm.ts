import type { LinkEvent } from '../interfaces/turntable-link';

/**
 * Why what the controller says ends the arm of its rig, run or no run; null where it does not. Whatever lets people or surprises into the
 * room does, and so does the loss of the position: homing after it needs a person at the rig and a new arm.
 * @param before whether the position was known before this event, and the arm that stands; its `bootId`: the start of the controller for which it was given, null: not known
 */
export function endOfArm(
  event: LinkEvent,
  { wasKnown, arm }: { wasKnown: boolean; arm: { bootId: string | null; fromUtcMs: number } | null },
): string | null {
  switch (event.kind) {
    case 'interlock':
      return event.closed ? null : openings.interlock;
    case 'supply':
      return event.present ? null : openings.supply;
    case 'arm-key':
      return event.on ? null : openings['arm-key'];
    case 'reset':
      return 'the controller restarted';
    case 'standstill':
      return wasKnown && event.angleDeg === null ? positionLost : null;
    case 'ready': {
      const { controller, unheard } = event;
      // It may have restarted while the server was away, and nobody told.
      if (arm !== null && arm.bootId !== null && arm.bootId !== controller.bootId) return 'the controller restarted';
      // So may somebody have come in and gone again.
      if (arm !== null && unheard !== null && unheard.utcMs >= arm.fromUtcMs) return `${openings[unheard.input]} while no server listened`;
      if (!controller.interlockClosed) return 'the interlock is open';
      if (!controller.supplyPresent) return 'the motor supply is off';
      if (!controller.armKey) return 'the arm key is off';
      return wasKnown && !controller.positionKnown ? positionLost : null;
    }
    default:
      return null;
  }
}

const openings = { interlock: 'the interlock was opened', supply: 'the motor supply was lost', 'arm-key': 'the arm key was turned off' };
const positionLost = 'the position was lost';

/** Whether the position is known after an event, as far as it tells. */
export function knownAfter(event: LinkEvent, before: boolean): boolean {
  switch (event.kind) {
    case 'ready':
      return event.controller.positionKnown;
    case 'homed':
      return true;
    case 'standstill':
      return event.angleDeg !== null;
    case 'supply':
      return before && event.present;
    case 'reset':
      return false;
    default:
      return before;
  }
}
