import type { RigDocument } from './document';

/**
 * Two invented rigs: a wide one whose turntable turns freely and whose stations stand at the greatest torque, and a
 * close one whose source masses pass the pendulum's balls by 8 mm and can never pass 0 degrees. Uncertainties are those of a
 * careful teaching laboratory: calliper, tape and laboratory balance.
 */

const normal = <U extends string>(value: number, u: number, unit: U) => ({ value, u, unit });

const pendulum: RigDocument['pendulum'] = {
  arm: normal(0.075, 0.00005, 'm'),
  ballMass: normal(0.02, 0.00001, 'kg'),
  ballRadius: normal(0.0075, 0.00001, 'm'),
  beamMass: normal(0.004, 0.00001, 'kg'),
  beamLength: normal(0.135, 0.0001, 'm'),
  balls: 2,
  travel_rad: 0.05,
};

const sources = (orbitM: number): RigDocument['sources'] => ({
  shape: 'sphere',
  count: 2,
  mass: normal(1.6, 0.0001, 'kg'),
  radius: normal(0.0323, 0.00002, 'm'),
  orbit: normal(orbitM, 0.0001, 'm'),
  offset: normal(0, 0.0005, 'm'),
});

const station = (angleDeg: number) => normal(angleDeg, 0.05, 'deg');

/** Lever, fibre, ring-down and noise are the same on both. The decay time belongs to a quality factor of 8. */
const shared = {
  pendulum,
  readout: { range_rad: 0.03 },
  lever: { distance: normal(5, 0.002, 'm'), fold: 2, sense: 1 },
  fibre: { length: normal(0.12, 0.0005, 'm'), diameter: normal(0.000025, 0.0000003, 'm'), shearModulus: normal(1.61e11, 5e9, 'Pa') },
  measured: { period_s: normal(420, 0.1, 's'), decayTime_s: normal(1067.430265, 27, 's') },
  noise: { readout_rad: 0.00001, walk_rad_per_sqrt_min: 0.0000015, drift_rad_per_h: 0.00001 },
} satisfies Partial<RigDocument>;

/** 200 full steps, 16 microsteps and a belt ratio of 5 make 44.444… steps to a degree. */
const drive = { stepsPerDegree: (200 * 16 * 5) / 360, maxSpeed_deg_s: 6, maxAcceleration_deg_s2: 2 };

/** The demo rig, wide kind: near and far stand at the greatest torque, 20.18 degrees to either side of the arm. */
export const demoRigWide: RigDocument = {
  ...shared,
  sources: sources(0.125),
  stations: {
    near: station(20.18),
    far: station(-20.18),
    clear: station(90),
    inline: station(0),
    across: station(90),
    nearBack: station(-159.82),
    farBack: station(159.82),
  },
  motion: { ...drive, minDeg: -175, maxDeg: 175, homeDeg: 0 },
};

/**
 * The close kind: at its stations each source stands square to the arm beside a ball, 48 mm from centre to centre.
 * The balls would touch at 26.3 degrees, so the arc to 29 degrees on both sides of 0 is kept out.
 */
export const demoRigNarrow: RigDocument = {
  ...shared,
  sources: sources(0.08904493247793),
  stations: { near: station(32.62), far: station(147.38), clear: station(90) },
  motion: { ...drive, minDeg: 30, maxDeg: 150, homeDeg: 90, keepOut: [[-29, 29]] },
};
