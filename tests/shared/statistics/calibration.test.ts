import * as fc from 'fast-check';
import { calibrationOf, fitScale, lineOf, mmAt, uMmAt } from '@/shared/spot/scale';
import { calibrated, calibrationFault, uCalibrated, uOfCalibrated } from '@/shared/statistics/calibration';

/** JCGM 100:2008, table H.6: readings of a thermometer, °C, and the corrections to them, °C. */
const readings = [21.521, 22.012, 22.512, 23.003, 23.507, 23.999, 24.513, 25.002, 25.503, 26.01, 26.511];
const corrections = [-0.171, -0.169, -0.166, -0.159, -0.164, -0.165, -0.156, -0.157, -0.159, -0.161, -0.16];
const thermometer = fitScale(
  readings.map((reading, i) => ({ px: reading - 20, mm: corrections[i] as number })),
  0,
);
if (thermometer === null) throw new Error('no line');

test('the calibration of a thermometer is that of the guide: offset, slope, u, correlation, and a predicted value', () => {
  const line = lineOf(thermometer);
  // JCGM 100:2008, H.3.3: y1 = −0.1712 °C, s = 0.0029 °C; y2 = 0.002 18, s = 0.000 67; r = −0.930; s = 0.0035 °C.
  expect(line.offset).toBeCloseTo(-0.1712, 4);
  expect(line.uOffset).toBeCloseTo(0.0029, 4);
  expect(line.slope).toBeCloseTo(0.00218, 5);
  expect(line.uSlope).toBeCloseTo(0.00067, 5);
  expect(line.covariance / (line.uOffset * line.uSlope)).toBeCloseTo(-0.93, 3);
  expect(thermometer.scatterMm).toBeCloseTo(0.0035, 4);
  // H.3.4: at 30 °C the correction is −0.1494 °C with u = 0.0041 °C.
  expect(calibrated(line, 10)).toBeCloseTo(-0.1494, 4);
  expect(uCalibrated(line, 10)).toBeCloseTo(0.0041, 4);
});

const scale = fc
  .tuple(fc.double({ min: -2, max: 2, noNaN: true }), fc.double({ min: -50, max: 50, noNaN: true }))
  .filter(([slope]) => Math.abs(slope) > 0.01)
  .map(([slope, offset]) =>
    fitScale(
      [30, 170, 300, 620].map((px, i) => ({ px, mm: offset + slope * px + [0.03, -0.02, 0.01, -0.01][i]! })),
      0.05,
    ),
  );

test('line, scale about its mean, and the u that a channel of millimetres keeps say the same everywhere', () => {
  fc.assert(
    fc.property(scale, fc.double({ min: 0, max: 800, noNaN: true }), (fitted, px) => {
      if (fitted === null) throw new Error('no scale');
      const mm = mmAt(fitted, px);
      const u = uMmAt(fitted, px, 0);
      expect(calibrated(lineOf(fitted), px)).toBeCloseTo(mm, 8);
      expect(uCalibrated(lineOf(fitted), px) / u).toBeCloseTo(1, 4);
      const kept = calibrationOf(fitted);
      expect(calibrated(kept, mm)).toBe(mm);
      expect(uOfCalibrated(kept, mm) / u).toBeCloseTo(1, 4);
      expect([calibrationFault(kept), calibrationFault(lineOf(fitted))]).toEqual([null, null]);
    }),
    { numRuns: 100 },
  );
});

test('figures that no calibration has are refused in words', () => {
  const line = { offset: 0, slope: 1, uOffset: 0.1, uSlope: 0.01, covariance: 0 };
  expect(calibrationFault(line)).toBeNull();
  expect(calibrationFault({ ...line, slope: 0 })).toMatch(/slope of 0/);
  expect(calibrationFault({ ...line, covariance: -0.0011 })).toMatch(/correlation would be beyond 1/);
  expect(calibrationFault({ ...line, covariance: -0.001 })).toBeNull();
});
