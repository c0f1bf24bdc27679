import * as fc from 'fast-check';
import { pathObstacles } from '@/shared/protocol/motion-path';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigMotion } from '@/shared/rig/document';

const motion = (more: Partial<RigMotion>): RigMotion => ({ ...(demoRigWide.motion as RigMotion), minDeg: -720, maxDeg: 720, ...more });
const angle = fc.integer({ min: -7200, max: 7200 }).map((tenths) => tenths / 10);
const arc = fc
  .tuple(fc.integer({ min: -3600, max: 3600 }), fc.integer({ min: 1, max: 1500 }))
  .map(([from, length]): [number, number] => [from / 10, (from + length) / 10]);

/** Is an angle inside the arc or one of its images by 180 deg? Asked angle by angle, without the interval arithmetic of the rule. */
function inside(angleDeg: number, [from, to]: [number, number]): boolean {
  for (let shift = -1800; shift <= 1800; shift += 180) {
    if (angleDeg >= from + shift - 1e-9 && angleDeg <= to + shift + 1e-9) return true;
  }
  return false;
}

test('a path meets an arc if and only if one of its angles lies in the arc or in an image of it', () => {
  fc.assert(
    fc.property(angle, angle, arc, (from, to, keepOut) => {
      const tenths = Math.round(Math.abs(to - from) * 10);
      const onTheWay = Array.from({ length: tenths + 1 }, (_, index) => from + (Math.sign(to - from) * index) / 10);
      const met = onTheWay.some((angleDeg) => inside(angleDeg, keepOut));
      expect(pathObstacles(motion({ keepOut: [keepOut] }), from, to).length > 0).toBe(met);
    }),
    { numRuns: 300 },
  );
});

test('the way back is as free as the way there', () => {
  fc.assert(
    fc.property(angle, angle, fc.array(arc, { maxLength: 3 }), (from, to, keepOut) => {
      expect(pathObstacles(motion({ keepOut }), from, to)).toEqual(pathObstacles(motion({ keepOut }), to, from));
    }),
  );
});

test('every arc that is met is named', () => {
  const reasons = pathObstacles(
    motion({
      keepOut: [
        [10, 20],
        [30, 40],
        [200, 205],
      ],
    }),
    0,
    90,
  ).map(({ reason }) => reason);
  expect(reasons).toHaveLength(3);
  expect(reasons[2]).toContain('200° to 205° in its image 20° to 25°');
});
