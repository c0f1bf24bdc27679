import type { ImportMapping } from '@/shared/contracts/data';
import { leverOf, spotM } from '@/shared/physics/lever';
import type { RigDocument } from '@/shared/rig/document';

const perRadian = { rad: 1, mrad: 1e3, urad: 1e6 } as const;

/**
 * Greatest distance between two values of a deflection channel, in `unit`: what the readout, or else the pendulum,
 * covers from end to end. Null where the rig states neither; `no-lever` where a spot position means nothing because
 * the rig has no lever.
 */
export function greatestSpan(rig: RigDocument, unit: ImportMapping['unit']): number | null | 'no-lever' {
  const lever = leverOf(rig);
  const halfRad = rig.readout?.range_rad ?? rig.pendulum.travel_rad;
  if (unit !== 'm' && unit !== 'mm') return halfRad === undefined ? null : 2 * halfRad * perRadian[unit];
  if (lever === null) return 'no-lever';
  if (halfRad === undefined) return null;
  const spanM = Math.abs(spotM(halfRad, lever) - spotM(-halfRad, lever));
  return unit === 'mm' ? 1000 * spanM : spanM;
}
