import { buildArchive } from '@/shared/archive/build-archive';
import { readArchive } from '@/shared/archive/read-archive';
import type { ChannelCalibration } from '@/shared/archive/run-records';
import type { BuildArchiveInput } from '@/shared/archive/build-archive';
import { sha256Hex } from '@/server/evaluation/sha256';
import { relativeDifference } from '../../support/check-data';
import { evaluateNight } from '../../support/evaluate-night';
import { alternatingAngles, night, type NightPlan } from '../../support/night';
import { closeRig, closeSourceAngleRad, withRig } from '../../support/reference-rigs';

/** Readings of a channel with a calibration: stored as they were read, evaluated as what they truly say. */

const near = (closeSourceAngleRad * 180) / Math.PI;
const angles = { anglesDeg: alternatingAngles(8, near, 180 - near), dwellS: 900 };
const byAngle: NightPlan = { rig: closeRig(), ...angles };
const leverRig = withRig(closeRig(), (rig) => {
  rig.lever = { distance: { value: 5, u: 0.002, unit: 'm' }, fold: 2, sense: 1 };
});
const bySpot: NightPlan = { rig: leverRig, ...angles, unit: 'mm', reading: (angle) => 40 + 5000 * Math.tan(2 * angle) };

const calibration: ChannelCalibration = { revision: 3, offset: 0.4, slope: 1.05, uOffset: 0.2, uSlope: 0.002, covariance: -1e-4 };
/** The readings that the calibration makes the true values of. */
const asRead =
  (change: Partial<ChannelCalibration> = {}) =>
  (input: BuildArchiveInput) => ({
    ...input,
    channels: input.channels.map((series) =>
      series.info.role !== 'deflection'
        ? series
        : {
            ...series,
            info: { ...series.info, calibration: { ...calibration, ...change } },
            value: series.value.map((one) => (one - calibration.offset) / calibration.slope),
          },
    ),
  });

test.each([
  ['angle', byAngle],
  ['spot', bySpot],
])('G of a channel in %s is that of the true values, and the slope has a line of its own', (_, plan) => {
  const plain = evaluateNight(plan).result;
  const found = evaluateNight(plan, {}, asRead()).result;
  expect(relativeDifference(found.G?.value ?? NaN, plain.G?.value ?? NaN)).toBeLessThan(1e-7);
  const line = found.budget?.find(({ input }) => input === 'calibration.slope');
  expect(line).toMatchObject({ value: 1.05, u: 0.002 });
  // JCGM 100:2008, 5.1.2: what a whole new evaluation with a slope that is greater and less by h gives.
  const h = 1e-4;
  const [more, less] = [h, -h].map((step) => evaluateNight(plan, {}, asRead({ slope: 1.05 + step })).result.G?.value ?? NaN);
  expect(relativeDifference(line?.sensitivity ?? NaN, ((more ?? NaN) - (less ?? NaN)) / (2 * h))).toBeLessThan(1e-3);
  const others = (plain.budget ?? []).reduce((sum, { contribution }) => sum + contribution ** 2, 0);
  expect(relativeDifference(found.G?.u ?? NaN, Math.sqrt(others + (line?.contribution ?? NaN) ** 2))).toBeLessThan(1e-6);
});

test('the offset drops out of near minus far: u of G knows nothing of it', () => {
  const [without, withU] = [0, 5].map((uOffset) => evaluateNight(byAngle, {}, asRead({ uOffset, covariance: 0 })).result.G?.u);
  expect(withU).toBe(without);
});

test('trials draw the slope with the rest', () => {
  const { result } = evaluateNight(bySpot, { trials: 20_000 }, asRead({ uSlope: 0.02 }));
  // JCGM 101: the slope decides here, so that its share is nearly all of u.
  expect(relativeDifference(result.monteCarlo?.G_u ?? NaN, result.G?.u ?? NaN)).toBeLessThan(0.03);
});

test('the archive keeps readings and calibration; one that cannot be used is refused, never passed over', () => {
  const files = buildArchive(asRead()(night(byAngle)), sha256Hex);
  const text = new TextDecoder().decode(files.get('datapackage.json'));
  expect(
    JSON.parse(text).resources.find(({ evenfall }: { evenfall?: object }) => evenfall !== undefined && 'calibration' in evenfall).evenfall
      .calibration,
  ).toEqual(calibration);
  const read = readArchive(files, sha256Hex).readChannel('deflection');
  const first = night(byAngle).channels[0]?.value[0] ?? NaN;
  expect(read.value[0]).toBeCloseTo(first, 12);
  for (const wrong of ['"slope": 0', '"slope": "much"', '"slop": 1.05']) {
    const changed = new Map(files).set('datapackage.json', new TextEncoder().encode(text.replace('"slope": 1.05', wrong)));
    expect(() => readArchive(changed, sha256Hex)).toThrow(/calibration of the resource channels\/deflection\.csv cannot be used/);
  }
});
