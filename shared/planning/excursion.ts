import { NEAR_LIMIT } from '../conditions/dwell-verdict';
import { CODATA_2022_G, RAD_PER_DEG } from '../physics/constants';
import { equilibriumRad } from '../physics/equilibrium';
import { oscillatorOf } from '../physics/oscillator';
import { Pendulum } from '../physics/pendulum';
import { geometryOf } from '../physics/torque';
import { trapezoid } from '../physics/trapezoid';
import type { Finding } from '../protocol/finding';
import type { Timeline, TimelineItem } from '../protocol/timeline';
import type { RigDocument } from '../rig/document';

const milli = (rad: number) => (1000 * rad).toPrecision(3);

/** Share of the free travel that a plan may use. */
const travelShare = 0.8;

/** How far the pendulum may swing out to either side, rad, and what says so; the rig's document may leave both out. */
function excursionLimits({ pendulum, readout }: RigDocument): { name: string; limitRad: number }[] {
  return [
    {
      name: `${travelShare} of pendulum.travel_rad`,
      limitRad: pendulum.travel_rad === undefined ? undefined : travelShare * pendulum.travel_rad,
    },
    { name: 'readout.range_rad', limitRad: readout?.range_rad },
  ].flatMap(({ name, limitRad }) => (limitRad === undefined ? [] : [{ name, limitRad }]));
}

/**
 * Of a plan that is not refused, where a run may hold all the same: a dwell that ends with the pendulum so near to the end of the readout holds it
 * (`excursion` of a judged dwell). The travel needs no advice, for it refuses earlier.
 */
export function nearLimitAdvice({ readout }: RigDocument, peakRad: number | null): Finding[] {
  const rangeRad = readout?.range_rad;
  if (peakRad === null || rangeRad === undefined || peakRad > rangeRad || peakRad < NEAR_LIMIT * rangeRad) return [];
  return [
    {
      code: 'excursion',
      path: null,
      message: `The pendulum would swing out to ${milli(peakRad)} mrad, beyond ${NEAR_LIMIT} of readout.range_rad, ${milli(NEAR_LIMIT * rangeRad)} mrad: a dwell that ends with so much holds the run. Take a beat of whole periods, or smaller swings.`,
    },
  ];
}

/** One finding for each limit that the greatest excursion of a plan passes. */
export function excursionFindings(rig: RigDocument, peakRad: number | null): Finding[] {
  if (peakRad === null) return [];
  return excursionLimits(rig)
    .filter(({ limitRad }) => peakRad > limitRad)
    .map(({ name, limitRad }) => ({
      code: 'excursion',
      path: null,
      message: `The pendulum would swing out to ${milli(peakRad)} mrad, beyond ${name}, ${milli(limitRad)} mrad. Take a beat of whole periods, or smaller swings.`,
    }));
}

/**
 * How a run that begins then and there stands to the limits of the pendulum: why it is refused, and what is to be told of one that is not. Where
 * the greatest that the swings could add up to stays within the limits, the equation is not solved.
 */
export function excursionOf(
  rig: RigDocument,
  timeline: Pick<Timeline, 'items' | 'startUtcMs' | 'endUtcMs'>,
): { refusals: Finding[]; advice: Finding[] } {
  const least = Math.min(...excursionLimits(rig).map(({ limitRad }) => limitRad), NEAR_LIMIT * (rig.readout?.range_rad ?? Infinity));
  const bound = least === Infinity ? null : excursionBoundRad(rig, timeline.items);
  if (bound === null || bound < least) return { refusals: [], advice: [] };
  const peakRad = peakExcursionRad(rig, timeline);
  return { refusals: excursionFindings(rig, peakRad), advice: nearLimitAdvice(rig, peakRad) };
}

/** What a move may leave beyond the difference of its equilibria: it passes the angle of greatest torque on its way. */
const boundMargin = 1.5;

/**
 * More than the pendulum can swing out to: as if each move set it ringing by the whole difference of equilibria and all the ringing met in
 * phase, rad. Null where nothing can be told.
 */
function excursionBoundRad(rig: RigDocument, items: readonly TimelineItem[]): number | null {
  const oscillator = oscillatorOf(rig);
  if (oscillator === null) return null;
  // What these do in between is not told by where they begin and end.
  if (items.some(({ kind }) => kind === 'kick' || kind === 'rotate')) return Infinity;
  const geometry = geometryOf(rig);
  const known = new Map<number, number>();
  const restAt = (angleDeg: number): number => {
    const found =
      known.get(angleDeg) ??
      equilibriumRad({ geometry, kappa: oscillator.kappa, bigG: CODATA_2022_G.value, phiRad: angleDeg * RAD_PER_DEG });
    known.set(angleDeg, found);
    return found;
  };
  let [ringing, atUtcMs, greatest] = [0, items[0]?.startUtcMs ?? 0, 0];
  try {
    for (const { angleFromDeg, angleToDeg, startUtcMs } of items) {
      ringing *= Math.exp((-oscillator.gamma * (startUtcMs - atUtcMs)) / 1000);
      atUtcMs = startUtcMs;
      if (angleFromDeg !== angleToDeg) ringing += boundMargin * (Math.abs(restAt(angleFromDeg)) + Math.abs(restAt(angleToDeg)));
      greatest = Math.max(greatest, ringing + Math.abs(restAt(angleToDeg)));
    }
  } catch {
    return Infinity;
  }
  return greatest;
}

/** Hours of turning are worked out in steps of this length, s: the torque has no corners but at the ramps, and this is no evaluation. */
const STEP_IN_ROTATION_S = 1;

/** Looked at so often in a period. */
const looksPerPeriod = 40;

/**
 * Greatest angle of the pendulum from its rest line during a plan, rad, by the exact equation from rest on; null where the rig's pendulum is not
 * measured or has no equilibrium where the plan begins.
 */
export function peakExcursionRad(rig: RigDocument, timeline: Pick<Timeline, 'items' | 'startUtcMs' | 'endUtcMs'>): number | null {
  const oscillator = oscillatorOf(rig);
  if (oscillator === null) return null;
  const { items, startUtcMs, endUtcMs } = timeline;
  const geometry = geometryOf(rig);
  const bigG = CODATA_2022_G.value;
  const phiRad = (items[0]?.angleFromDeg ?? 0) * RAD_PER_DEG;
  let angleRad: number;
  try {
    angleRad = equilibriumRad({ geometry, kappa: oscillator.kappa, bigG, phiRad });
  } catch {
    return null;
  }
  const slowly = items.some(({ kind }) => kind === 'rotate') ? { stepInMotionS: STEP_IN_ROTATION_S } : {};
  const pendulum = new Pendulum({ geometry, oscillator, bigG, ...slowly }, { angleRad, speedRadS: 0 });
  const angleDegAt = anglesOf(items);
  const stepS = oscillator.periodS / looksPerPeriod;
  let peak = Math.abs(angleRad);
  for (let atS = stepS; atS <= (endUtcMs - startUtcMs) / 1000; atS += stepS) {
    pendulum.advanceTo(atS, (s) => angleDegAt(startUtcMs + s * 1000) * RAD_PER_DEG);
    peak = Math.max(peak, Math.abs(pendulum.angleRad));
  }
  return Number.isFinite(peak) ? peak : null;
}

/** The turntable's angle over the plan; asked in time order. */
function anglesOf(items: readonly TimelineItem[]): (utcMs: number) => number {
  const moves = items.map((item) => moveOf(item));
  let last = 0;
  return (utcMs) => {
    if (utcMs < (items[last]?.startUtcMs ?? 0)) last = 0;
    while (last + 1 < items.length && (items[last + 1] as TimelineItem).startUtcMs <= utcMs) last += 1;
    const item = items[last];
    return item === undefined ? 0 : (moves[last] as (tS: number) => number)((utcMs - item.startUtcMs) / 1000);
  };
}

function moveOf({ angleFromDeg, angleToDeg, speedDegS, accelerationDegS2, startUtcMs, endUtcMs }: TimelineItem): (tS: number) => number {
  if (angleFromDeg === angleToDeg) return () => angleToDeg;
  if (speedDegS !== undefined && accelerationDegS2 !== undefined)
    return trapezoid({ fromDeg: angleFromDeg, toDeg: angleToDeg, speedDegS, accelerationDegS2 }).angleDegAt;
  const lengthS = Math.max(1e-9, (endUtcMs - startUtcMs) / 1000);
  return (tS) => angleFromDeg + (angleToDeg - angleFromDeg) * Math.min(1, Math.max(0, tS / lengthS));
}
