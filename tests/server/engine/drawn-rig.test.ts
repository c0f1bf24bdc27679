import { drawnRig } from '@/server/engine/rehearsal/drawn-rig';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { withRig } from '../../support/reference-rigs';

/** What a rig may be that its document describes. */

const { pendulum, sources, stations } = demoRigWide;

test('values scatter about those of the document by their uncertainties, and what has none stays', () => {
  const exact = withRig(demoRigWide, (rig) => {
    rig.pendulum.beamMass.u = 0;
    Object.assign(rig.sources.orbit as object, { distribution: 'rectangular' });
  });
  const drawings = Array.from({ length: 400 }, (_, k) => drawnRig(exact, k + 1).rig);
  const rms = (of: (rig: typeof exact) => number) => Math.sqrt(drawings.reduce((sum, rig) => sum + of(rig) ** 2, 0) / drawings.length);
  // 400 drawings tell a standard deviation to 3.5 %, of a rectangular one to 2.2 %.
  expect(Math.abs(rms((rig) => (rig.pendulum.arm.value - pendulum.arm.value) / pendulum.arm.u) - 1)).toBeLessThan(0.14);
  const orbits = (rig: typeof exact) => ((rig.sources.orbit?.value ?? 0) - (sources.orbit?.value ?? 0)) / (sources.orbit?.u ?? 1);
  expect(Math.abs(rms(orbits) - 1)).toBeLessThan(0.09);
  expect(Math.max(...drawings.map((rig) => Math.abs(orbits(rig))))).toBeLessThanOrEqual(Math.sqrt(3));
  expect(new Set(drawings.map((rig) => rig.pendulum.beamMass.value))).toEqual(new Set([pendulum.beamMass.value]));
  // What is measured of the pendulum, and the lever, are no geometry.
  expect(drawings[0]?.measured).toEqual(demoRigWide.measured);
  expect(drawings[0]?.lever).toEqual(demoRigWide.lever);
});

test('what shares its error is off by as many of its uncertainties', () => {
  const grouped = withRig(demoRigWide, (rig) => {
    for (const one of [rig.pendulum.arm, rig.sources.orbit]) Object.assign(one as object, { group: 'calliper' });
  });
  const { rig } = drawnRig(grouped, 5);
  const off = (now: number | undefined, before: { value: number; u: number } | undefined) =>
    ((now ?? 0) - (before?.value ?? 0)) / (before?.u ?? 1);
  expect(off(rig.pendulum.arm.value, pendulum.arm)).not.toBe(0);
  expect(off(rig.sources.orbit?.value, sources.orbit)).toBeCloseTo(off(rig.pendulum.arm.value, pendulum.arm), 9);
});

test('the sources stand where the stations really are, and in between in proportion', () => {
  const { rig, angleDeg } = drawnRig(demoRigWide, 7);
  const offAt = (name: string) => (rig.stations[name]?.value ?? 0) - (stations[name]?.value ?? 0);
  expect(angleDeg(20.18) - 20.18).toBeCloseTo(offAt('near'), 12);
  expect(angleDeg(-20.18) + 20.18).toBeCloseTo(offAt('far'), 12);
  expect(angleDeg(10.09) - 10.09).toBeCloseTo((offAt('near') + offAt('inline')) / 2, 12);
  expect(angleDeg(179) - 179).toBeCloseTo(offAt('farBack'), 12);
  expect(angleDeg(-179) + 179).toBeCloseTo(offAt('nearBack'), 12);
  expect(offAt('near')).not.toBe(offAt('far'));
});

test('the same seed draws the same rig, another one another', () => {
  expect(drawnRig(demoRigWide, 3).rig).toEqual(drawnRig(demoRigWide, 3).rig);
  expect(drawnRig(demoRigWide, 3).rig).not.toEqual(drawnRig(demoRigWide, 4).rig);
});
