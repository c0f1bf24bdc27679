import { CODATA_2022_G, RAD_PER_DEG } from '../physics/constants';
import { equilibriumRad } from '../physics/equilibrium';
import { inertiaKgM2 } from '../physics/oscillator';
import { geometryOf } from '../physics/torque';
import type { RigDocument } from '../rig/document';
import { equivalence } from '../statistics/equivalence';
import type { Analysis } from './analysis';
import type { ControlResult } from './result';

/** Share of the loaded rig's signal within which an empty control must lie, where no bound is given. */
const boundShare = 1e-3;

/**
 * The test of an empty control: whether near minus far, less what the parts that turn along must give, is shown to lie within the bound
 * (rad). Null in a place says that it cannot be told: the rig has no mass set to compare with, or too few dwells to judge the scatter by.
 */
export function controlTest(rig: RigDocument, { reversal, free }: Analysis, boundRad: number | null): ControlResult | null {
  if (rig.sources.shape !== 'none' || reversal === null) return null;
  const kappa = inertiaKgM2(rig) * free.omega0Squared.value;
  const expected = signalOf(rig, kappa) ?? 0;
  const loaded = signalOf(loadedRig(rig), kappa);
  const bound = boundRad ?? (loaded === null ? null : boundShare * Math.abs(loaded));
  if (bound === null || reversal.known === null) return { expected_rad: expected, bound_rad: bound, p: null, equivalent: null };
  const { value, u, nu } = reversal.known;
  return { expected_rad: expected, bound_rad: bound, ...equivalence({ value: value - expected, u, nu }, bound) };
}

/** Near minus far that gravity gives with G of CODATA 2022, rad; null where it cannot be told. */
function signalOf(rig: RigDocument | null, kappa: number): number | null {
  if (rig === null) return null;
  const [near, far] = [rig.stations.near, rig.stations.far];
  if (near === undefined || far === undefined) return null;
  const geometry = geometryOf(rig);
  const restAt = ({ value }: { value: number }) =>
    equilibriumRad({ geometry, kappa, bigG: CODATA_2022_G.value, phiRad: value * RAD_PER_DEG });
  return restAt(near) - restAt(far);
}

/** The rig with the mass set that its document still names put back on; a height is that of a cylinder. Null where it names none. */
function loadedRig(rig: RigDocument): RigDocument | null {
  const { mass, orbit, radius, height } = rig.sources;
  if (mass === undefined || orbit === undefined) return null;
  const shape = height !== undefined && radius !== undefined ? 'cylinder' : 'sphere';
  return { ...rig, sources: { ...rig.sources, shape } };
}
