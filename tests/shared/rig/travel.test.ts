import * as fc from 'fast-check';
import { pathObstacles } from '@/shared/protocol/motion-path';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import { rigDocumentSchema, type RigMotion } from '@/shared/rig/document';
import {
  arcOutside,
  compareLimits,
  keepOutEntered,
  limitsOfTravel,
  travelFindings,
  travelWithTurns,
  turnStepsOf,
  withTravel,
} from '@/shared/rig/travel';

describe('travel taught by hand', () => {
  test('of the close rig: ends at 28° and 152° with 2° of margin give its limits, and the rest is its keep-out arc', () => {
    const taught = { leastDeg: 28, greatestDeg: 152, marginDeg: 2 };
    expect(limitsOfTravel(taught)).toEqual({ minDeg: 30, maxDeg: 150 });
    expect(arcOutside(taught)).toEqual([-28, 28]);
    const revised = withTravel(demoRigNarrow, taught, true);
    expect(rigDocumentSchema.parse(revised)).toEqual(revised);
    expect(revised.motion).toMatchObject({
      minDeg: 30,
      maxDeg: 150,
      keepOut: [
        [-29, 29],
        [-28, 28],
      ],
    });
    // ends further in: the arc of the document is covered and gone
    expect(withTravel(demoRigNarrow, { leastDeg: 29.5, greatestDeg: 150.5, marginDeg: 0.5 }, true).motion?.keepOut).toEqual([
      [-29.5, 29.5],
    ]);
    expect(withTravel(demoRigNarrow, taught, false).motion?.keepOut).toEqual([[-29, 29]]);
  });

  test('is rounded inwards, the arc outwards, and no limit lies in the arc', () => {
    fc.assert(
      fc.property(
        fc.double({ min: -170, max: -1, noNaN: true }),
        fc.double({ min: 1, max: 170, noNaN: true }),
        fc.double({ min: 0.05, max: 0.4, noNaN: true }),
        (leastDeg, greatestDeg, marginDeg) => {
          const taught = { leastDeg, greatestDeg, marginDeg };
          const { minDeg, maxDeg } = limitsOfTravel(taught);
          expect(minDeg).toBeGreaterThanOrEqual(leastDeg + marginDeg - 1e-6);
          expect(maxDeg).toBeLessThanOrEqual(greatestDeg - marginDeg + 1e-6);
          const { motion } = withTravel(demoRigWide, taught, true);
          if (motion !== undefined && greatestDeg - leastDeg < 179) expect(pathObstacles(motion, minDeg, maxDeg)).toEqual([]);
        },
      ),
    );
  });

  test('of more than half a turn leaves nothing to keep out', () => {
    expect(arcOutside({ leastDeg: -100, greatestDeg: 100, marginDeg: 2 })).toBeNull();
  });

  test.each([
    [{ leastDeg: 10, greatestDeg: -10, marginDeg: 2 }, 'greatestDeg', 'above the least'],
    [{ leastDeg: -3, greatestDeg: 3, marginDeg: 3 }, 'marginDeg', 'leaves nothing'],
    [{ leastDeg: -10, greatestDeg: 10, marginDeg: -1 }, 'marginDeg', '0 or more'],
    [{ leastDeg: -190, greatestDeg: 190, marginDeg: 2 }, 'greatestDeg', 'under 360°'],
    [{ leastDeg: 10, greatestDeg: 90, marginDeg: 2 }, 'leastDeg', 'could not be homed'],
  ])('%j is refused in words', (taught, field, words) => {
    expect(travelFindings(demoRigWide, taught)).toEqual([{ state: 'refused', field, message: expect.stringContaining(words) }]);
    expect(() => withTravel(demoRigWide, taught, false)).toThrow(RangeError);
  });

  test('names the stations that would be out of reach', () => {
    const findings = travelFindings(demoRigWide, { leastDeg: -60, greatestDeg: 60, marginDeg: 2 });
    expect(findings).toEqual([
      {
        state: 'note',
        field: 'marginDeg',
        message: expect.stringContaining('clear (90°), across (90°), nearBack (−159.82°), farBack (159.82°)'),
      },
    ]);
    expect(travelFindings(demoRigWide, { leastDeg: -170, greatestDeg: 170, marginDeg: 2 })).toEqual([]);
  });

  test('a small turn enters an arc from outside or goes on inside it; out of it is always free', () => {
    const motion = demoRigNarrow.motion as RigMotion;
    expect(keepOutEntered(motion, 31, 30)).toBeNull();
    expect(keepOutEntered(motion, 30, 28)).toContain('the keep-out arc −29° to 29°');
    expect(keepOutEntered(motion, 28, 27)).toContain('−29° to 29°');
    expect(keepOutEntered(motion, 27, 30)).toBeNull();
    expect(keepOutEntered(motion, 150, 152)).toContain('its image 151° to 209°');
  });
});

test('limits of the controller are held against the document row by row', () => {
  const document = { minDeg: -175, maxDeg: 175, maxSpeed_deg_s: 6, maxAcceleration_deg_s2: 2, homeSpeed_deg_s: 0.6 };
  const stepsPerDegree = 16_000 / 360;
  // Position -7778 microsteps is -175.005°: rounding, no difference.
  const rounded = { ...document, minDeg: -7778 / stepsPerDegree, maxSpeed_deg_s: 5.99998 };
  expect(compareLimits(rounded, document, stepsPerDegree).map(({ state }) => state)).toEqual(['same', 'same', 'same', 'same', 'same']);
  const never = { minDeg: -81, maxDeg: 81, maxSpeed_deg_s: 4.5, maxAcceleration_deg_s2: 4.5, homeSpeed_deg_s: 2.25 };
  expect(compareLimits(never, document, stepsPerDegree).map(({ state }) => state)).toEqual([
    'tighter',
    'tighter',
    'tighter',
    'wider',
    'wider',
  ]);
});

test('a table turns beyond its travel by the whole turns that its cables stand, and by none where an arc is kept out', () => {
  const motion = demoRigWide.motion as RigMotion;
  expect(travelWithTurns(motion)).toEqual({ leastDeg: -175, greatestDeg: 175 });
  expect(travelWithTurns({ ...motion, turnsLimit: 2.9 })).toEqual({ leastDeg: -895, greatestDeg: 895 });
  expect(travelWithTurns({ ...motion, turnsLimit: 2, keepOut: [[40, 60]] })).toEqual({ leastDeg: -175, greatestDeg: 175 });
  expect([turnStepsOf(motion), turnStepsOf({ ...motion, turnsLimit: 1 })]).toEqual([null, 16_000]);
});
