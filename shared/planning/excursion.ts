import { CODATA_2022_G, RAD_PER_DEG } from '../physics/constants';
import { equilibriumRad } from '../physics/equilibrium';
import { oscillatorOf } from '../physics/oscillator';
import { Pendulum } from '../physics/pendulum';
import { geometryOf } from '../physics/torque';
import { trapezoid } from '../physics/trapezoid';
import type { Timeline, TimelineItem } from '../protocol/timeline';
import type { RigDocument } from '../rig/document';

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
  const pendulum = new Pendulum({ geometry, oscillator, bigG }, { angleRad, speedRadS: 0 });
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
