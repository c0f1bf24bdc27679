import type { RigDocument } from '@/shared/rig/document';

const RAD = Math.PI / 180;
const q = <U extends string>(value: number, unit: U, u = 0) => ({ value, u, unit });

/** The two reference rigs of the check tables: N (close approach) and W (wide). Uncertainties are zero unless given. */
export const closeSourceAngleRad = Math.atan2(0.048, 0.075);
export const wideSourceAngleRad = 0.3522219011278853;

export function closeRig(): RigDocument {
  return rigWith(Math.hypot(0.075, 0.048), closeSourceAngleRad / RAD, 180 - closeSourceAngleRad / RAD);
}

export function wideRig(): RigDocument {
  return rigWith(0.125, wideSourceAngleRad / RAD, -wideSourceAngleRad / RAD);
}

function rigWith(orbitM: number, nearDeg: number, farDeg: number): RigDocument {
  return {
    pendulum: {
      arm: q(0.075, 'm'),
      ballMass: q(0.02, 'kg'),
      ballRadius: q(0.0075, 'm'),
      beamMass: q(0.004, 'kg'),
      beamLength: q(0.135, 'm'),
      balls: 2,
    },
    sources: { shape: 'sphere', count: 2, mass: q(1.6, 'kg'), radius: q(0.0323, 'm'), orbit: q(orbitM, 'm'), offset: q(0, 'm') },
    stations: { near: q(nearDeg, 'deg'), far: q(farDeg, 'deg') },
    lever: { distance: q(5, 'm'), fold: 2, sense: 1 },
    measured: { period_s: q(420, 's'), decayTime_s: q(1067.4302650055924, 's') },
  };
}

/** The same rig with other settings in the parts named. */
export function withRig(rig: RigDocument, change: (rig: RigDocument) => void): RigDocument {
  const copy = structuredClone(rig);
  change(copy);
  return copy;
}
