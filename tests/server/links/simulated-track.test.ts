import * as fc from 'fast-check';
import { brakeStretches, rampStretches, reachedUs, Track } from '@/server/links/simulated-track';

const durationS = (to: number, speed: number, acceleration: number) =>
  (rampStretches({ from: 0, to, speed, acceleration, startUs: 0 }).at(-1)?.toUs ?? 0) / 1e6;

test.each([
  // Physics reference, K2: v = 6, a = 2 and v = 10, a = 5 (here in microsteps).
  [114.76151385761, 6, 2, 22.12691897627],
  [40.361656773404, 6, 2, 9.726942795567],
  [10, 6, 2, 4.472135955],
  [18, 6, 2, 6],
  [90, 10, 5, 11],
])('%f steps at %f and %f take %f s', (...[steps, speed, acceleration, awaitedS]) => {
  expect(durationS(steps, speed, acceleration)).toBeCloseTo(awaitedS, 9);
  expect(durationS(-steps, speed, acceleration)).toBeCloseTo(awaitedS, 9);
});

const motion = fc.record({
  from: fc.integer({ min: -8000, max: 8000 }),
  to: fc.integer({ min: -8000, max: 8000 }),
  speed: fc.double({ min: 1, max: 4000, noNaN: true }),
  acceleration: fc.double({ min: 1, max: 8000, noNaN: true }),
});

test('a motion is smooth, never faster or steeper than asked, and ends exactly', () => {
  fc.assert(
    fc.property(motion, ({ from, to, speed, acceleration }) => {
      const stretches = rampStretches({ from, to, speed, acceleration, startUs: 5e6 });
      const track = new Track(from);
      track.add(stretches);
      const endUs = stretches.at(-1)?.toUs ?? 5e6;
      expect(track.at(0).position).toBe(from);
      expect(track.at(endUs)).toEqual({ position: to, speed: 0 });
      let before = track.at(5e6);
      const stepS = (endUs - 5e6) / 500 / 1e6;
      const worst = { speed: 0, acceleration: 0, jump: 0 };
      for (let k = 1; k <= 500 && stepS > 0; k += 1) {
        const here = track.at(5e6 + k * stepS * 1e6);
        worst.speed = Math.max(worst.speed, Math.abs(here.speed));
        worst.acceleration = Math.max(worst.acceleration, Math.abs(here.speed - before.speed) / stepS);
        worst.jump = Math.max(worst.jump, Math.abs(here.position - before.position - ((here.speed + before.speed) / 2) * stepS));
        before = here;
      }
      expect(worst.speed).toBeLessThanOrEqual(speed * (1 + 1e-9));
      expect(worst.acceleration).toBeLessThanOrEqual(acceleration * (1 + 1e-6) + 1e-3);
      // Where acceleration changes within a step the trapezoid rule is off by no more than this.
      expect(worst.jump).toBeLessThan(0.3 * acceleration * stepS ** 2 + 1e-6);
    }),
    { seed: 11, numRuns: 200 },
  );
});

test('braking from anywhere in a motion ends on a whole microstep before the target, no steeper than asked', () => {
  fc.assert(
    fc.property(motion, fc.double({ min: 0.001, max: 0.999, noNaN: true }), ({ from, to, speed, acceleration }, share) => {
      fc.pre(from !== to);
      const stretches = rampStretches({ from, to, speed, acceleration, startUs: 0 });
      const track = new Track(from);
      track.add(stretches);
      const us = (stretches.at(-1)?.toUs as number) * share;
      const brake = brakeStretches(track.at(us), acceleration, us);
      const last = brake.at(-1);
      if (last === undefined) return;
      expect(Number.isInteger(last.to)).toBe(true);
      expect(Math.abs(last.acceleration)).toBeLessThanOrEqual(acceleration * (1 + 1e-6));
      expect((to - last.to) * Math.sign(to - from)).toBeGreaterThanOrEqual(0);
    }),
    { seed: 12, numRuns: 500 },
  );
});

test('braking never takes longer than the ramp from full speed and one slow microstep', () => {
  fc.assert(
    fc.property(motion, fc.double({ min: 1e-6, max: 0.999999, noNaN: true }), ({ from, to, speed, acceleration }, share) => {
      fc.pre(from !== to);
      const stretches = rampStretches({ from, to, speed, acceleration, startUs: 0 });
      const track = new Track(from);
      track.add(stretches);
      const us = (stretches.at(-1)?.toUs as number) * share;
      const endUs = brakeStretches(track.at(us), acceleration, us).at(-1)?.toUs ?? us;
      expect((endUs - us) / 1e6).toBeLessThanOrEqual(speed / acceleration + 2 * Math.sqrt(2 / acceleration));
    }),
    { seed: 13, numRuns: 500 },
  );
});

test('tells when a place is passed', () => {
  const stretches = rampStretches({ from: -100, to: 100, speed: 50, acceleration: 25, startUs: 0 });
  // 200 steps at 50/s and 25/s²: 2 s up, 2 s cruise, 2 s down; the middle after 3 s.
  expect(reachedUs(stretches, 0)).toBeCloseTo(3e6, 3);
  expect(reachedUs(stretches, -50)).toBeCloseTo(2e6, 3);
  expect(reachedUs(stretches, 100)).toBeCloseTo(6e6, 0);
  expect(reachedUs(stretches, 101)).toBeNull();
});

test('remembers where it stood between motions', () => {
  const track = new Track(0);
  track.add(rampStretches({ from: 0, to: 100, speed: 50, acceleration: 50, startUs: 1e6 }));
  track.cut(10e6, 100);
  track.add(rampStretches({ from: 100, to: 0, speed: 50, acceleration: 50, startUs: 20e6 }));
  expect(track.at(0.5e6).position).toBe(0);
  expect(track.at(15e6).position).toBe(100);
  expect(track.at(60e6).position).toBe(0);
});
