import type { ArchivedChannel } from '../archive/read-archive';
import { UnusableArchive } from '../archive/unusable-archive';
import { angleRadOfSpot, leverOf, spotM, type Lever } from '../physics/lever';
import type { RigDocument } from '../rig/document';

/** How readings of a deflection channel become pendulum angles. */
export type ChannelScale =
  | { kind: 'angle'; radPerUnit: number }
  /** Spot positions; `zeroGiven` false means that the zero is the mean of the equilibria. */
  | { kind: 'spot'; metresPerUnit: number; lever: Lever; zeroGiven: boolean };

const angleUnits: Record<string, number> = { rad: 1, mrad: 1e-3, urad: 1e-6 };
const lengthUnits: Record<string, number> = { m: 1, mm: 1e-3 };

/** @throws UnusableArchive for a unit that is no deflection, or a length without a lever in rig.json. */
export function scaleOf(info: ArchivedChannel, rig: RigDocument): ChannelScale {
  const radPerUnit = angleUnits[info.unit];
  if (radPerUnit !== undefined) return { kind: 'angle', radPerUnit };
  const metresPerUnit = lengthUnits[info.unit];
  if (metresPerUnit === undefined) {
    throw new UnusableArchive(
      { file: 'datapackage.json' },
      `the channel "${info.name}" has the unit "${info.unit}"; a deflection is in rad, urad, mrad, m or mm`,
    );
  }
  const lever = leverOf(rig);
  if (lever === null)
    throw new UnusableArchive(
      { file: 'rig.json' },
      `the channel "${info.name}" is in ${info.unit}, so lever.distance, fold and sense are needed`,
    );
  return { kind: 'spot', metresPerUnit, lever, zeroGiven: rig.lever?.zero !== undefined };
}

/** The same scale with its zero at another reading, m. */
export function withZero(scale: ChannelScale, zeroM: number): ChannelScale {
  return scale.kind === 'angle' ? scale : { ...scale, lever: { ...scale.lever, zeroM } };
}

/** Pendulum angle of a reading in the channel's unit, rad. */
export function toRad(scale: ChannelScale, reading: number): number {
  return scale.kind === 'angle' ? reading * scale.radPerUnit : angleRadOfSpot(reading * scale.metresPerUnit, scale.lever);
}

/** Reading, m, at which a spot scale shows the angle: where to move its zero to make that angle 0. */
export function spotOfAngle(scale: ChannelScale & { kind: 'spot' }, angleRad: number): number {
  return spotM(angleRad, scale.lever);
}

/** The angle that another lever would make of the spot at which this one shows `angleRad`. */
export function reread(scale: ChannelScale, angleRad: number, lever: Lever | null): number {
  if (scale.kind === 'angle' || lever === null) return angleRad;
  const zeroM = scale.zeroGiven ? lever.zeroM : scale.lever.zeroM;
  return angleRadOfSpot(spotM(angleRad, scale.lever), { ...lever, zeroM });
}
