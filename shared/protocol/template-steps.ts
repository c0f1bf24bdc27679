import type { RigDocument } from '../rig/document';
import type { Step } from './document';
import { swingMove, UnplayableStep } from './durations';
import { pathObstacles } from './motion-path';
import { partsIfPossible } from './step-parts';

/** The steps that the built-in templates are made of, with lengths in periods of the rig's pendulum. */

export const swing = (to: string | number): Step => ({ kind: 'swing', to: typeof to === 'string' ? to : { angle_deg: to } });

/** From swing to swing two whole periods, so that no swing adds to the ringing of the one before. */
const beat: Step = { kind: 'dwell', beat_periods: 2 };
export const reversal = (to: string | number): Step[] => [swing(to), beat];
export const pair: Step[] = [...reversal('far'), ...reversal('near')];

/** What a night is asked for before it is worth running: drift below a tenth of a milliradian an hour over the time that a first look takes. */
export const calm = (windowS: number): Step => ({
  kind: 'settle',
  calmWhen: { drift_urad_per_h: 100, window_s: windowS },
  atMost_s: 5400,
  otherwise: 'continue',
});
export const usualCalmS = 600;

const wideScan = [-70, -45, -30, -20, -10, 0, 10, 20, 30, 45, 70];
const closeScan = [33, 40, 50, 65, 90, 115, 130, 140, 147];

/** Angles that can be reached from the home position and from each other, ascending, deg. */
export function scanAngles(rig: RigDocument): number[] {
  const motion = rig.motion;
  if (motion === undefined) return wideScan;
  const reachable = (angles: number[]) => angles.filter((angleDeg) => pathObstacles(motion, motion.homeDeg, angleDeg).length === 0);
  const wide = reachable(wideScan);
  const close = reachable(closeScan);
  return close.length > wide.length ? close : wide;
}

/** Proof pair and wait take an hour together, but the wait no less than usual, s. */
export const restOfHourS = (rig: RigDocument): number => Math.max(usualCalmS, 3600 - 4 * Math.round(rig.measured?.period_s?.value ?? 420));

/** What a turn from station to station leaves of a beat of two periods, s; a turn that cannot be planned counts as none. */
export function restOfBeatS(rig: RigDocument, from: string, to: string): number {
  const beatS = 2 * (rig.measured?.period_s?.value ?? 420);
  try {
    const { durationS } = swingMove({ to }, rig, rig.stations[from]?.value ?? 0);
    return Math.max(1, Math.round((beatS - durationS) * 1000) / 1000);
  } catch (error) {
    if (error instanceof UnplayableStep) return beatS;
    throw error;
  }
}

/** A kick at a station or an angle (deg): 2 mrad, or less where the sources of the rig cannot give that; none where its pendulum is not measured. */
export function kick(rig: RigDocument, at: string | number, periods: number): Step[] {
  const step = (amplitude: number): Step => ({ kind: 'kick', amplitude_urad: amplitude, periods });
  const angleDeg = typeof at === 'number' ? at : rig.stations[at]?.value;
  if (angleDeg === undefined || rig.motion === undefined) return [step(2000)];
  const amplitude = [2000, 1000, 500, 200, 100, 50, 20, 10].find((each) => partsIfPossible(step(each), rig, angleDeg) !== null);
  return amplitude === undefined ? [] : [step(amplitude)];
}
