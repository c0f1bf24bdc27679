import { degrees, pathObstacles } from '../protocol/motion-path';
import type { RigDocument, RigMotion } from './document';

/** Travel limits that a person taught by hand: the two ends as found, and what stays between an end and its limit. Pure. */

export interface TaughtTravel {
  /** Turntable angles at the two ends, deg. */
  leastDeg: number;
  greatestDeg: number;
  /** Kept between each end and its limit, deg. */
  marginDeg: number;
}

export interface TravelFinding {
  /** `refused`: no such limits are made; `note`: to be known before they are. */
  state: 'refused' | 'note';
  field: 'leastDeg' | 'greatestDeg' | 'marginDeg';
  message: string;
}

/** Common practice (no source): the ends are found by eye and feeler, the limits stay clear of them by this much. */
export const usualMarginDeg = 2;

const hundredth = (deg: number, round: (x: number) => number) => round(Number((deg * 100).toFixed(6))) / 100 + 0;

/** The limits of the taught travel, rounded inwards to 0.01°. */
export const limitsOfTravel = ({ leastDeg, greatestDeg, marginDeg }: TaughtTravel): Pick<RigMotion, 'minDeg' | 'maxDeg'> => ({
  minDeg: hundredth(leastDeg + marginDeg, Math.ceil),
  maxDeg: hundredth(greatestDeg - marginDeg, Math.floor),
});

/**
 * What lies outside the ends as a keep-out arc, rounded outwards to 0.01°. Arcs count every 180° anew, because either source meets either
 * ball; null where the travel leaves nothing over.
 */
export function arcOutside({ leastDeg, greatestDeg }: TaughtTravel): [number, number] | null {
  const arc: [number, number] = [hundredth(greatestDeg - 180, Math.floor), hundredth(leastDeg, Math.ceil)];
  return arc[0] < arc[1] ? arc : null;
}

/** What stands against these limits, or should be known about them. */
export function travelFindings(document: RigDocument, taught: TaughtTravel): TravelFinding[] {
  const refused = refusalOf(document, taught);
  if (refused !== null) return [refused];
  const { minDeg, maxDeg } = limitsOfTravel(taught);
  const outside = Object.entries(document.stations).filter(([, { value }]) => value < minDeg || value > maxDeg);
  if (outside.length === 0) return [];
  const names = outside.map(([name, { value }]) => `${name} (${degrees(value)})`).join(', ');
  return [
    {
      state: 'note',
      field: 'marginDeg',
      message: `Outside ${degrees(minDeg)} to ${degrees(maxDeg)}, so that no run could go there: ${names}.`,
    },
  ];
}

function refusalOf({ motion }: RigDocument, taught: TaughtTravel): TravelFinding | null {
  const { leastDeg, greatestDeg, marginDeg } = taught;
  const refuse = (field: TravelFinding['field'], message: string): TravelFinding => ({ state: 'refused', field, message });
  if (!Number.isFinite(marginDeg) || marginDeg < 0) return refuse('marginDeg', 'The margin is a number of degrees, 0 or more.');
  if (!(leastDeg < greatestDeg))
    return refuse('greatestDeg', `The greatest angle ${degrees(greatestDeg)} must lie above the least ${degrees(leastDeg)}.`);
  const { minDeg, maxDeg } = limitsOfTravel(taught);
  if (minDeg >= maxDeg) return refuse('marginDeg', `Twice the margin leaves nothing of ${degrees(leastDeg)} to ${degrees(greatestDeg)}.`);
  if (maxDeg - minDeg >= 360)
    return refuse(
      'greatestDeg',
      `The travel would be ${degrees(maxDeg - minDeg)}; it must stay under 360°, or the home flag tells two places as one.`,
    );
  if (motion !== undefined && (motion.homeDeg <= minDeg || motion.homeDeg >= maxDeg))
    return refuse(
      motion.homeDeg <= minDeg ? 'leastDeg' : 'greatestDeg',
      `The home edge at ${degrees(motion.homeDeg)} lies outside ${degrees(minDeg)} to ${degrees(maxDeg)}: the table could not be homed.`,
    );
  return null;
}

/**
 * The rig document with these limits; with `keepRestOut` the arc outside the ends replaces the keep-out arcs that it covers.
 * @throws RangeError where {@link travelFindings} refuses, or the document has no motion
 */
export function withTravel(document: RigDocument, taught: TaughtTravel, keepRestOut: boolean): RigDocument {
  const refused = refusalOf(document, taught);
  if (refused !== null) throw new RangeError(refused.message);
  if (document.motion === undefined) throw new RangeError('The rig document has no motion section.');
  const arc = keepRestOut ? arcOutside(taught) : null;
  const others = (document.motion.keepOut ?? []).filter(([from, to]) => arc === null || !covers(arc, [from, to]));
  const arcs = arc === null ? others : [...others, arc];
  const motion = { ...document.motion, ...limitsOfTravel(taught) };
  return { ...document, motion: arcs.length === 0 ? motion : { ...motion, keepOut: arcs } };
}

/** Whether an arc lies in another, or in an image of it by a multiple of 180°. */
function covers([from, to]: readonly [number, number], inner: readonly [number, number]): boolean {
  const shift = 180 * Math.floor((inner[0] - from) / 180 + 1e-9);
  return inner[0] >= from + shift - 1e-9 && inner[1] <= to + shift + 1e-9;
}

/**
 * What a small turn would enter of the arcs that are kept out of runs, in words; null where it enters none. Whoever stands in an arc may
 * always turn out of it.
 */
export function keepOutEntered(motion: RigMotion, fromDeg: number, toDeg: number): string | null {
  const inArc = (deg: number) => pathObstacles(motion, deg, deg).some(({ code }) => code === 'keep-out');
  const met = pathObstacles(motion, fromDeg, toDeg).find(({ code }) => code === 'keep-out');
  return met === undefined || (inArc(fromDeg) && !inArc(toDeg)) ? null : met.reason;
}

/** How many whole turns to either side a rig may make beyond its travel: none where an arc is kept out, for a turn passes every angle. */
export const freeTurns = ({ turnsLimit = 0, keepOut = [] }: Pick<RigMotion, 'turnsLimit' | 'keepOut'>): number =>
  keepOut.length === 0 ? Math.floor(turnsLimit) : 0;

/** How far the turntable may turn at all, deg: the travel of swings, and to either side the turns that its cables stand. */
export function travelWithTurns(motion: RigMotion): { leastDeg: number; greatestDeg: number } {
  const turnsDeg = 360 * freeTurns(motion);
  return { leastDeg: motion.minDeg - turnsDeg, greatestDeg: motion.maxDeg + turnsDeg };
}

/** Microsteps of a turn of a table that may make whole turns; null for any other. */
export const turnStepsOf = (motion: RigMotion): number | null => (freeTurns(motion) > 0 ? Math.round(360 * motion.stepsPerDegree) : null);

/** Limits, caps and home speed in the rig's units. */
export interface MotionLimits {
  minDeg: number;
  maxDeg: number;
  maxSpeed_deg_s: number;
  maxAcceleration_deg_s2: number;
  homeSpeed_deg_s: number;
}

export interface LimitRow {
  name: keyof MotionLimits;
  label: string;
  unit: string;
  controller: number;
  document: number;
  /** `wider`: the controller would allow more than the rig document; `tighter`: moves that the document allows are refused. */
  state: 'same' | 'wider' | 'tighter';
}

const rowsOf: readonly { name: keyof MotionLimits; label: string; unit: string; wider: 'less' | 'more' }[] = [
  { name: 'minDeg', label: 'least angle', unit: 'deg', wider: 'less' },
  { name: 'maxDeg', label: 'greatest angle', unit: 'deg', wider: 'more' },
  { name: 'maxSpeed_deg_s', label: 'greatest speed', unit: '°/s', wider: 'more' },
  { name: 'maxAcceleration_deg_s2', label: 'greatest acceleration', unit: '°/s²', wider: 'more' },
  { name: 'homeSpeed_deg_s', label: 'home speed', unit: '°/s', wider: 'more' },
];

/** What the controller reports against what the rig document says; `tolerance` is the rounding of one microstep, in the unit of the row. */
export function compareLimits(controller: MotionLimits, document: MotionLimits, stepsPerDegree: number): LimitRow[] {
  const tolerance = 0.75 / stepsPerDegree;
  return rowsOf.map(({ wider, ...row }) => {
    const more = controller[row.name] - document[row.name];
    const isSame = Math.abs(more) <= tolerance;
    const state = isSame ? 'same' : more > 0 === (wider === 'more') ? 'wider' : 'tighter';
    return { ...row, controller: controller[row.name], document: document[row.name], state };
  });
}
