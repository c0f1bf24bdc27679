import { catchMotion } from '@/shared/physics/catch-motion';
import { CODATA_2022_G } from '@/shared/physics/constants';
import { kickMoves } from '@/shared/physics/kick';
import { oscillatorOf } from '@/shared/physics/oscillator';
import type { PendulumSetting } from '@/shared/physics/pendulum';
import { residualAtPeriod, shapedSwing } from '@/shared/physics/shaped-swing';
import { geometryOf } from '@/shared/physics/torque';
import { closeRig, closeSourceAngleRad, wideRig, wideSourceAngleRad } from '../../support/reference-rigs';

/** Check values of this file: an independent implementation (DOP853, rtol 1e-10) of the exact equation, for two reference rigs. */
const DEG = 180 / Math.PI;
const settingOf = (rig: ReturnType<typeof wideRig>): PendulumSetting => {
  const oscillator = oscillatorOf(rig);
  if (oscillator === null) throw new Error('the reference rig has a measured period');
  return { geometry: geometryOf(rig), oscillator, bigG: CODATA_2022_G.value };
};
const wide = settingOf(wideRig());
const close = settingOf(closeRig());
const W = { setting: wide, fromDeg: -wideSourceAngleRad * DEG, toDeg: wideSourceAngleRad * DEG };
const N = { setting: close, fromDeg: 180 - closeSourceAngleRad * DEG, toDeg: closeSourceAngleRad * DEG };
/** As good as instantaneous. */
const instant = { speedDegS: 1e5, accelerationDegS2: 1e9 };

function shaped(at: typeof W, moves: 2 | 3, slew = instant) {
  const found = shapedSwing({ ...at, slew, moves });
  if ('why' in found) throw new Error(found.why);
  return found;
}

describe('catching a motion', () => {
  const { omegaD: omega, gamma, omega0 } = oscillatorOf(wideRig()) ?? { omegaD: 1, gamma: 0, omega0: 1 };

  test('takes a pendulum that rests beside the target over in half a period', () => {
    const found = catchMotion({ off: -1, speed: 0 }, { omega, gamma });
    expect(found?.level).toBeCloseTo(-0.45097448, 7);
    expect(found?.holdS).toBeCloseTo(210, 6);
  });

  test('stops a pendulum that swings through the target', () => {
    const found = catchMotion({ off: 0, speed: 0.2 * omega }, { omega, gamma });
    expect(found?.level).toBeCloseTo(0.189640267, 6);
    expect(found?.holdS).toBeCloseTo(363.587712, 3);
    expect(omega0).toBeGreaterThan(omega);
  });
});

describe('a shaped swing', () => {
  // The exact optimum: angle of the first move and start of the second.
  test.each([
    ['W, instantaneous', W, instant, 1.093964, 209.36119],
    ['W, 1 deg/s² and 3 deg/s', W, { accelerationDegS2: 1, speedDegS: 3 }, 1.094268, 212.20437],
    ['W, 0.5 deg/s² and 1.5 deg/s', W, { accelerationDegS2: 0.5, speedDegS: 1.5 }, 1.095211, 214.76398],
    ['N, instantaneous', N, instant, 76.5806, 210.12816],
    ['N, 0.5 deg/s² and 1.5 deg/s', N, { accelerationDegS2: 0.5, speedDegS: 1.5 }, 75.7313, 206.15415],
  ])('of two moves is the published optimum for %s', (_, at, slew, middleDeg, secondS) => {
    const { moves, residual } = shaped(at, 2, slew);
    expect(Math.abs((moves[0]?.toDeg ?? 0) - middleDeg)).toBeLessThan(1e-3);
    expect(Math.abs((moves[1]?.startS ?? 0) - secondS)).toBeLessThan(5e-3);
    expect(residual).toBeLessThan(1e-5);
  });

  test('of three moves leaves nothing either, and forgives an error of the period that two moves do not', () => {
    for (const at of [W, N]) {
      const [two, three] = [shaped(at, 2), shaped(at, 3)];
      expect(three.residual).toBeLessThan(1e-4);
      const at5 = {
        two: residualAtPeriod({ ...at, slew: instant }, two.moves, 0.05),
        three: residualAtPeriod({ ...at, slew: instant }, three.moves, 0.05),
      };
      // Linear theory, −5 %: 0.0713 and 0.0051.
      expect(at5.two).toBeGreaterThan(0.066);
      expect(at5.two).toBeLessThan(0.077);
      expect(at5.three).toBeLessThan(0.0075);
    }
  });

  test('is refused where it cannot be: no step, a turntable too slow, a torque that turns back on the way', () => {
    const refused = (input: Partial<Parameters<typeof shapedSwing>[0]>) => {
      const found = shapedSwing({ ...W, slew: instant, moves: 2, ...input });
      return 'why' in found ? found.why : null;
    };
    expect(refused({ fromDeg: W.toDeg, toDeg: W.toDeg - 180 })).toContain('nothing to shape');
    expect(refused({ slew: { speedDegS: 0.03, accelerationDegS2: 0.1 } })).toContain('do not fit');
    expect(refused({ fromDeg: -170, toDeg: 60, slew: { speedDegS: 3, accelerationDegS2: 1 } })).toContain('ringing');
  });
});

describe('a kick', () => {
  const slew = { speedDegS: 3, accelerationDegS2: 1 };
  const kick = (amplitudeRad: number) => kickMoves({ ...W, fromDeg: W.toDeg, toDeg: W.fromDeg, slew, amplitudeRad });
  const distance = 0.002373825686861;
  const K = 0.8214089649912;

  test.each([
    [0.001, 2],
    [0.002, 2],
    [0.006, 4],
  ])('of %f rad has the fewest moves and that amplitude', (amplitudeRad, count) => {
    const found = kick(amplitudeRad);
    if ('why' in found) throw new Error(found.why);
    expect(found.moves).toHaveLength(count);
    expect(found.moves.at(-1)?.toDeg).toBe(W.toDeg);
    expect(Math.abs(found.amplitudeRad / amplitudeRad - 1)).toBeLessThan(1e-3);
  });

  test('beyond D/(1 − K) is refused with that limit', () => {
    const found = kick(0.0135);
    expect('why' in found && found.limitRad).toBeCloseTo(distance / (1 - K), 5);
  });
});
