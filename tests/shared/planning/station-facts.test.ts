import { stationsFacts, type StationsFacts } from '@/shared/planning/station-facts';
import { stationWords } from '@/shared/planning/station-words';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';
import { relativeDifference } from '../../support/check-data';
import { closeRig, wideRig, withRig } from '../../support/reference-rigs';

/** Torques, sensitivities and relative u of an independent implementation (physics.md A3 and F4). */

const factsOf = (rig: RigDocument) => stationsFacts(rig) as StationsFacts;
const nearOf = (facts: StationsFacts) => facts.stations.find(({ name }) => name === 'near');
const textOf = (rig: RigDocument) => stationWords(rig, factsOf(rig));

test('torque and its change per 0.1° at near, close and wide', () => {
  const [close, wide] = [factsOf(closeRig()), factsOf(wideRig())];
  expect(relativeDifference(nearOf(close)?.torque.value ?? NaN, 1.351114587365e-10 + 3.611800049271e-12)).toBeLessThan(1e-9);
  expect(relativeDifference(nearOf(wide)?.torque.value ?? NaN, 6.081710887159e-11 + 1.044954366418e-12)).toBeLessThan(1e-9);
  expect(relativeDifference(nearOf(close)?.perTenthDegree ?? NaN, -0.005607632269031)).toBeLessThan(1e-9);
  expect(relativeDifference(nearOf(wide)?.perTenthDegree ?? NaN, -1.705995243206e-5)).toBeLessThan(1e-6);
  // Centres 48 mm apart, spheres of 32.3 and 7.5 mm.
  expect(nearOf(close)?.gapM).toBeCloseTo(0.0082, 9);
});

test('the wide rig reaches its maximum, the close one is kept from it', () => {
  const [wide, close] = [factsOf(demoRigWide), factsOf(demoRigNarrow)];
  expect(wide.greatest.angleDeg).toBeCloseTo(20.181, 2);
  expect(Math.abs(wide.greatest.perTenthDegree)).toBeLessThan(3e-5);
  // The travel limit stands at 30°, the arc at 29°.
  expect(close.greatest.angleDeg).toBeCloseTo(30, 6);
  expect(close.curve.find(({ angleDeg }) => angleDeg === 29)?.state).toBe('kept out');
  expect(close.curve.find(({ angleDeg }) => angleDeg === 10)?.state).toBe('touching');
  expect(textOf(demoRigWide)[0]?.text).toContain('nothing keeps the masses from there');
  expect(textOf(demoRigNarrow)[0]?.text).toContain('on the slope');
});

test('0.05° at each station: 0.2 % of G on the slope, next to nothing at the top', () => {
  expect(factsOf(demoRigNarrow).angleRelativeU).toBeCloseTo(0.002, 4);
  expect(factsOf(demoRigWide).angleRelativeU).toBeLessThan(1.2e-5);
  expect(textOf(demoRigNarrow).filter(({ kind }) => kind === 'warning')).toEqual([
    { kind: 'warning', text: expect.stringContaining('a relative u of 0.20') as string },
  ]);
  expect(textOf(demoRigWide).every(({ kind }) => kind === 'said')).toBe(true);
});

test('u of the torque follows the geometry: the orbit of the wide rig makes most of it', () => {
  const { torque } = nearOf(factsOf(demoRigWide)) ?? { torque: { value: NaN, u: NaN } };
  // Torque goes with R to about −4.7 and d to about 1 + 1.7 (I also goes with d²): 0.1 mm in 125 mm, 0.05 mm in 75 mm.
  expect(torque.u / torque.value).toBeGreaterThan(0.0037);
  expect(torque.u / torque.value).toBeLessThan(0.0048);
});

test('stations that stand wrongly are warned of; a turntable without masses has no curve', () => {
  const warnings = (change: (rig: RigDocument) => void) =>
    textOf(withRig(demoRigNarrow, change))
      .filter(({ kind }) => kind === 'warning')
      .map(({ text }) => text)
      .join(' ');
  const near = { value: 20, u: 0.05, unit: 'deg' as const };
  expect(warnings((rig) => void (rig.stations.near = near))).toContain('At near a source would stand in a ball');
  expect(warnings((rig) => void (rig.stations.near = { ...near, value: 70 }))).toContain('the signal would grow by a factor');
  expect(warnings((rig) => void (rig.stations.near = { ...near, value: 152 }))).toContain('near lies outside the travel limits');
  expect(warnings((rig) => void (rig.stations.far = { ...near, value: 60 }))).toContain('pull to the same side');
  expect(stationsFacts(withRig(demoRigWide, (rig) => void (rig.sources = { shape: 'none' })))).toBeNull();
});
