import * as fc from 'fast-check';
import { compareSteps, roundedTo, stepsBetweenEdges, stepsPerDegreeOf, turnProblem } from '@/shared/rig/steps-per-degree';

describe('steps per degree', () => {
  test('of one marked turn is steps over angle, with the share of the angle as the share of u', () => {
    const { value, u, widenedBy } = stepsPerDegreeOf([{ steps: 400, turnedDeg: 9, uDeg: 0.09 }]);
    expect(value).toBeCloseTo(44.4444, 4);
    // u(k) / k = u(angle) / angle = 1 %
    expect(u).toBeCloseTo(0.444_444, 6);
    expect(widenedBy).toBe(1);
  });

  test('of a whole turn edge to edge knows the drive of the demo to 0.02 %', () => {
    const { value, u } = stepsPerDegreeOf([{ steps: 16_000, turnedDeg: 360, uDeg: 0.014 }]);
    expect(value).toBeCloseTo((200 * 16 * 5) / 360, 6);
    expect(u / value).toBeCloseTo(0.014 / 360, 8);
  });

  test('of equal turns falls with the root of their number, and both directions count alike', () => {
    const one = stepsPerDegreeOf([{ steps: 400, turnedDeg: 9, uDeg: 0.1 }]);
    const four = stepsPerDegreeOf([400, -400, 400, -400].map((steps) => ({ steps, turnedDeg: (9 * steps) / 400, uDeg: 0.1 })));
    expect(four.value).toBeCloseTo(one.value, 10);
    expect(four.u).toBeCloseTo(one.u / 2, 10);
  });

  test('of turns that contradict each other is less certain than each of them says', () => {
    const apart = stepsPerDegreeOf([
      { steps: 400, turnedDeg: 8.9, uDeg: 0.01 },
      { steps: 400, turnedDeg: 9.1, uDeg: 0.01 },
    ]);
    // residuals ± 10 u: chi² 200 on one degree of freedom
    expect(apart.widenedBy).toBeCloseTo(Math.sqrt(200), 6);
    expect(apart.u / apart.value).toBeCloseTo((Math.sqrt(200) * 0.01) / Math.SQRT2 / 9, 8);
  });

  test('finds the true value within its uncertainty for any drive', () => {
    fc.assert(
      fc.property(fc.double({ min: 2, max: 4000, noNaN: true }), fc.integer({ min: 10, max: 100_000 }), (truth, steps) => {
        const { value, u } = stepsPerDegreeOf([{ steps, turnedDeg: steps / truth, uDeg: 0.01 * (steps / truth) }]);
        expect(Math.abs(value - truth)).toBeLessThanOrEqual(1e-9 * truth);
        expect(u / value).toBeCloseTo(0.01, 9);
      }),
    );
  });

  test.each([
    [{ steps: 4, turnedDeg: 0.1, uDeg: 0.01 }, 'steps', 'at least 10'],
    [{ steps: 400, turnedDeg: 0, uDeg: 0.01 }, 'turnedDeg', 'not 0'],
    [{ steps: 400, turnedDeg: Number.NaN, uDeg: 0.01 }, 'turnedDeg', 'in degrees'],
    [{ steps: 400, turnedDeg: 9, uDeg: 0 }, 'uDeg', 'more than 0'],
    [{ steps: 400, turnedDeg: 9, uDeg: 9 }, 'uDeg', 'turn further'],
    [{ steps: 400, turnedDeg: -9, uDeg: 0.1 }, 'turnedDeg', 'wrong way'],
  ])('refuses %j in words', (reading, field, words) => {
    expect(turnProblem(reading)).toMatchObject({ field, message: expect.stringContaining(words) });
    expect(() => stepsPerDegreeOf([reading])).toThrow(RangeError);
  });

  test('is kept to the second digit of its uncertainty', () => {
    expect(roundedTo({ value: 44.443_21, u: 0.0113 })).toBe(44.443);
    expect(roundedTo({ value: 44.443_21, u: 0.9 })).toBe(44.44);
    expect(roundedTo({ value: 1234.567, u: 24 })).toBe(1235);
  });
});

test('a measured value is held against the rig document, with what a move of 90° would miss', () => {
  const same = compareSteps({ value: 44.44, u: 0.01 }, 44.4444);
  expect(same.agree).toBe(true);
  const other = compareSteps({ value: 22.2222, u: 0.01 }, 44.4444);
  expect(other).toMatchObject({ agree: false });
  expect(other.share).toBeCloseTo(-0.5, 4);
  expect(other.missAt90Deg).toBeCloseTo(90, 2);
});

describe('steps between passes of the edge', () => {
  const pass = (steps: number, direction: 'ccw' | 'cw') => ({ steps, direction });

  test('are taken in one direction only, so that backlash does not enter', () => {
    expect(stepsBetweenEdges([pass(3, 'ccw'), pass(-2, 'cw'), pass(16_003, 'ccw')])).toBe(16_000);
    expect(stepsBetweenEdges([pass(0, 'cw'), pass(-16_000, 'cw')])).toBe(-16_000);
  });

  test('are not known after one pass, or after a to and fro over one edge', () => {
    expect(stepsBetweenEdges([])).toBeNull();
    expect(stepsBetweenEdges([pass(3, 'ccw')])).toBeNull();
    expect(stepsBetweenEdges([pass(3, 'ccw'), pass(-2, 'cw')])).toBeNull();
    expect(stepsBetweenEdges([pass(3, 'ccw'), pass(-2, 'cw'), pass(4, 'ccw')])).toBeNull();
  });
});
