import { PROTOCOL_VERSION, refusalWords, type EndCause, type HiBody, type LimitsBody, type NoBody } from '@/firmware-protocol/codec';
import type { RigMotion } from '@/shared/rig/document';
import type { LinkCommand, MotionEndCause } from '../interfaces/turntable-link';
import { degOfSteps, limitsOf } from './rig-units';

/** What the link says to people, and how the controller's words map to the engine's. */

export const END_CAUSE: Record<Exclude<EndCause, 'search'>, MotionEndCause> = {
  done: 'done',
  hold: 'hold',
  stop: 'stop',
  off: 'stop',
  interlock: 'interlock',
  supply: 'supply',
  lease: 'lease',
  limit: 'limit',
  // A waiting move that a new session cancelled: like a lapsed lease, the host was away.
  session: 'lease',
  fault: 'limit',
};

export const HOMING_GAVE_UP =
  'the whole travel was searched and the home flag never changed; check the flag, its sensor and its wiring, and that the turntable turns when the motor does';

/** The limit that a refusal names, in degrees where it is a place or, for a nudge, a way. */
export function refusalMessage(rig: RigMotion, { code, detail }: NoBody, of: LinkCommand['kind']): string {
  const words = refusalWords(code);
  if (code === 'travel' && of === 'nudge')
    return `a nudge turns by ${(detail / rig.stepsPerDegree).toFixed(3)} deg at most, and not by nothing`;
  if (code === 'travel') return `${words}: ${degOfSteps(rig, detail).toFixed(3)} deg`;
  if (code === 'speed') return `${words}: ${(detail / 1000 / rig.stepsPerDegree).toFixed(3)} deg/s`;
  if (code === 'ramp') return `${words}: ${(detail / 1000 / rig.stepsPerDegree).toFixed(3)} deg/s2`;
  if (code === 'past') return `${words}: ${detail} ms ago`;
  return words;
}

/** Why limits were not taken; `answer` null: the line failed or nothing came. */
export function teachRefusal(rig: RigMotion, answer: NoBody | null): { code: string; message: string } {
  if (answer === null)
    return { code: 'no-answer', message: 'the controller did not answer; read its limits again to see whether it took the new ones' };
  const { code, detail } = answer;
  const most = (detail / 1000 / rig.stepsPerDegree).toFixed(3);
  if (code === 'speed') return { code, message: `this controller turns no faster than ${most} deg/s` };
  if (code === 'ramp') return { code, message: `this controller accelerates no more than ${most} deg/s2` };
  if (code === 'field')
    return { code, message: 'the least limit must lie below the greatest, and the home speed must not be above the greatest speed' };
  if (code === 'word') return { code, message: "this controller's firmware cannot be taught limits; they are set when it is flashed" };
  return { code, message: refusalWords(code) };
}

/** Null when this version can drive the controller. */
export function versionRefusal({ major, minor, firmware }: HiBody): string | null {
  if (major === PROTOCOL_VERSION.major) return null;
  return (
    `The controller (${firmware}) speaks version ${major}.${minor} of the line protocol, this server version ${PROTOCOL_VERSION.major}.${PROTOCOL_VERSION.minor}: ` +
    `they do not understand each other. Flash firmware of version ${PROTOCOL_VERSION.major}.x or update the server.`
  );
}

export function epochRefusal(detail: number): string {
  return `Another server has driven this controller (under number ${detail}), and it obeys only that one. Let it have the rig, or take the controller over.`;
}

export function silence(description: string, droppedLines: number, heardAny: boolean): string {
  if (heardAny) return `No valid reply from ${description} for 5 s.`;
  if (droppedLines === 0) return `Nothing answers at ${description}. Check that the controller is powered and that this is its port.`;
  return (
    `Something talks at ${description}, but not the controller's language: ${droppedLines} ${droppedLines === 1 ? 'line was' : 'lines were'} dropped. ` +
    'Check the port, the rate and the firmware.'
  );
}

/** Where the controller would allow more than the rig document; null when it does not. */
export function limitsRemark(rig: RigMotion, told: LimitsBody): string | null {
  const ours = limitsOf(rig);
  const wider = told.least < ours.least - 1 || told.greatest > ours.greatest + 1;
  const faster = told.speed > ours.speed + 1000 || told.acceleration > ours.acceleration + 1000;
  if (!wider && !faster) return null;
  const travel = `${degOfSteps(rig, told.least).toFixed(1)} to ${degOfSteps(rig, told.greatest).toFixed(1)} deg`;
  return `The controller's own limits are wider than the rig document's (${travel}, ${(told.speed / 1000 / rig.stepsPerDegree).toFixed(2)} deg/s); set them to the rig's.`;
}
