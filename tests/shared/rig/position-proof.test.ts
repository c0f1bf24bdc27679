import {
  afterMotion,
  afterPass,
  angleSourceOf,
  angleU,
  backlashSteps,
  doubtfulU,
  type EdgeDirection,
  homedProof,
  nothingProved,
  type PositionProof,
  slipToleranceDeg,
} from '@/shared/rig/position-proof';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';

/** 200 full steps × 16 × 5 to a turn: 0.0225° a microstep. */
const stepDeg = 360 / 16_000;
const withBacklash = (backlashDeg: number): RigDocument => ({
  ...demoRigWide,
  motion: { ...(demoRigWide.motion as NonNullable<RigDocument['motion']>), backlash_deg: backlashDeg },
});

const homed = homedProof({ utcMs: 0, uS: 0.0002 });
const pass = (rig: RigDocument, proof: PositionProof, direction: EdgeDirection, steps: number) =>
  afterPass(rig, proof, { utcMs: 1000, uS: 0.0002, direction, angleDeg: (rig.motion?.homeDeg ?? 0) + steps * stepDeg });
const passes = (rig: RigDocument, ...seen: [EdgeDirection, number][]) =>
  seen.reduce((proof, [direction, steps]) => pass(rig, proof, direction, steps), homed);

describe('slip and backlash from the passes of the edge', () => {
  test('a tight drive meets the edge one microstep apart in the two directions, and that is no backlash', () => {
    const proof = passes(demoRigWide, ['cw', -1], ['ccw', 0]);
    expect(proof).toMatchObject({ slip: null, proved: { direction: 'ccw', slipSteps: 0 } });
    expect(backlashSteps(proof)).toBe(0);
  });

  test('backlash is the difference between the directions; up to that of the rig document it is no slip', () => {
    const proof = passes(withBacklash(0.1), ['cw', -6]);
    expect(proof.slip).toBeNull();
    expect(backlashSteps(proof)).toBe(5);
  });

  test('backlash that the rig document does not know cannot be told from slip and is an alarm', () => {
    expect(passes(demoRigWide, ['cw', -6]).slip).toMatchObject({ steps: -5, direction: 'cw' });
  });

  test('backlash is unknown until the edge was met in both directions', () => {
    expect(backlashSteps(nothingProved)).toBeNull();
    expect(backlashSteps(homed)).toBeNull();
  });

  test.each<[EdgeDirection, number]>([
    ['ccw', 40],
    ['ccw', -40],
    ['cw', -41],
    ['cw', 39],
  ])('a table that moved on its belt is found at the next pass, %s at %i', (direction, steps) => {
    const before = passes(demoRigWide, ['cw', -1], ['ccw', 0]);
    expect(Math.abs(pass(demoRigWide, before, direction, steps).slip?.steps ?? 0)).toBe(40);
  });

  test('the tolerance is a microstep and three standard deviations of the difference of two passes of a flag of 0.01°', () => {
    expect(slipToleranceDeg(demoRigWide)).toBeCloseTo(0.0225 + 3 * Math.hypot(0.01, 0.01), 12);
    expect(passes(demoRigWide, ['ccw', 2]).slip).toBeNull();
    expect(passes(demoRigWide, ['ccw', 3]).slip).not.toBeNull();
  });

  test('slow creep is not carried along: every pass is held against the first since homing', () => {
    const proof = passes(demoRigWide, ['cw', -1], ['cw', -2], ['cw', -3], ['cw', -4]);
    expect(proof.slip).toMatchObject({ steps: -3 });
  });

  test('a slip stays until the rig is homed, whatever later passes say', () => {
    const proof = passes(demoRigWide, ['ccw', 40], ['cw', -1], ['ccw', 0]);
    expect(proof.slip).toMatchObject({ steps: 40 });
    expect(angleSourceOf(proof)).toBe('counted');
  });

  test('the edge may lie at any angle', () => {
    expect(passes(demoRigNarrow, ['cw', -1], ['ccw', 30]).slip).toMatchObject({ steps: 30 });
  });
});

describe('where an angle comes from, and how well it is known', () => {
  test('the motion after a proof is proved, the one after that is counted until the next pass', () => {
    expect(angleSourceOf(nothingProved)).toBe('counted');
    const once = afterMotion(homed);
    expect(angleSourceOf(once)).toBe('edge-verified');
    expect(angleSourceOf(afterMotion(once))).toBe('counted');
    expect(angleSourceOf(afterMotion(pass(demoRigWide, afterMotion(once), 'cw', -1)))).toBe('edge-verified');
  });

  /** By hand from GUM 4.3.7 and F.2.2.1: a = 0.0225°/2, u = a/√3; the flag 0.01°. */
  const readU = Math.hypot(0.01125 / Math.sqrt(3), 0.01);

  test('a proved angle carries the reading of the edge and the backlash as a rectangular width', () => {
    expect(angleU(demoRigWide, afterMotion(homed))).toBeCloseTo(readU, 12);
    expect(angleU(withBacklash(0.1), homed)).toBeCloseTo(Math.hypot(readU, 0.05 / Math.sqrt(3)), 12);
  });

  test('backlash that was measured counts where it is more than that of the rig document', () => {
    const proof = passes(withBacklash(0.1), ['cw', -7]);
    const measuredDeg = 6 * stepDeg;
    expect(angleU(withBacklash(0.1), { ...proof, proved: homed.proved })).toBeCloseTo(Math.hypot(readU, measuredDeg / Math.sqrt(12)), 12);
  });

  test('each motion without a pass may have slipped unseen by the tolerance', () => {
    const t = slipToleranceDeg(demoRigWide);
    const third = [1, 2, 3].reduce((proof) => afterMotion(proof), homed);
    expect(angleU(demoRigWide, third)).toBeCloseTo(Math.hypot(readU, t * Math.sqrt(2 / 3)), 12);
    expect(angleU(demoRigWide, nothingProved)).toBeCloseTo(Math.hypot(readU, t / Math.sqrt(3)), 12);
  });

  test('a dwell in doubt may be off by anything up to the slip: 40 microsteps are 0.9°', () => {
    expect(doubtfulU(demoRigWide, 0.012, 40)).toBeCloseTo(Math.hypot(0.012, 0.9 / Math.sqrt(3)), 12);
  });
});
