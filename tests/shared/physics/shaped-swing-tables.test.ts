import { CODATA_2022_G } from '@/shared/physics/constants';
import { oscillatorOf, type Oscillator } from '@/shared/physics/oscillator';
import type { PendulumSetting } from '@/shared/physics/pendulum';
import { residualAtPeriod, shapedSwing } from '@/shared/physics/shaped-swing';
import { angleOfRest, motionAfter, movesByCentroid, standingAt, type Slew, type TimedMove } from '@/shared/physics/timed-moves';
import { geometryOf } from '@/shared/physics/torque';
import { trapezoid } from '@/shared/physics/trapezoid';
import { closeRig, closeSourceAngleRad, wideRig, wideSourceAngleRad } from '../../support/reference-rigs';

/**
 * The tables G1 to G4 of physics.md: linear theory (Smith 1957, Singer and Seering 1990, both from memory) and an independent integration (DOP853,
 * rtol 1e-10) of the exact equation for two reference rigs.
 */

const DEG = 180 / Math.PI;
const settingOf = (rig: ReturnType<typeof wideRig>): PendulumSetting => ({
  geometry: geometryOf(rig),
  oscillator: oscillatorOf(rig) as Oscillator,
  bigG: CODATA_2022_G.value,
});
const rigs = {
  W: { setting: settingOf(wideRig()), fromDeg: -wideSourceAngleRad * DEG, toDeg: wideSourceAngleRad * DEG, nearS: 419.99664926 },
  N: { setting: settingOf(closeRig()), fromDeg: 180 - closeSourceAngleRad * DEG, toDeg: closeSourceAngleRad * DEG, nearS: 421.84230327 },
};
type Rig = Omit<(typeof rigs)['W'], 'nearS'>;
/** As good as instantaneous. */
const instant = { speedDegS: 1e5, accelerationDegS2: 1e9 };

/** Fractions of the step reached after each move but the last. */
const fractions = {
  1: () => [],
  2: (K: number) => [1 / (1 + K)],
  3: (K: number) => [1 / (1 + K) ** 2, (1 + 2 * K) / (1 + K) ** 2],
} as const;
type Count = keyof typeof fractions;

interface Rule {
  at: Rig;
  levels: readonly number[];
  periodS: number;
}

const anglesOf = ({ at, levels }: Rule): number[] => {
  const fromRad = standingAt(at.setting, at.fromDeg).restRad;
  const stepRad = standingAt(at.setting, at.toDeg).restRad - fromRad;
  return [at.fromDeg, ...levels.map((level) => angleOfRest(at.setting, at, fromRad + level * stepRad)), at.toDeg];
};

const movesOf = (rule: Rule, slew: Slew = instant): TimedMove[] =>
  movesByCentroid(rule.at.setting, slew, { anglesDeg: anglesOf(rule), pausesS: rule.levels.map(() => rule.periodS / 2) });

/** Amplitude left over the step in the rest. */
function residualOf({ at: { setting, fromDeg, toDeg } }: Pick<Rule, 'at'>, moves: readonly TimedMove[], slew: Slew = instant): number {
  const stepRad = standingAt(setting, toDeg).restRad - standingAt(setting, fromDeg).restRad;
  return Math.abs(motionAfter(setting, slew, moves).amplitudeRad / stepRad);
}

describe('linear theory (G1)', () => {
  const omegaD = (2 * Math.PI) / 420;
  /** The wide rig with so weak a pull that the torque is linear, of a damping ratio ζ. */
  const weak = (zeta: number): Rig => {
    const { setting, fromDeg, toDeg } = rigs.W;
    const gamma = (zeta / Math.sqrt(1 - zeta * zeta)) * omegaD;
    const kappa = setting.oscillator.inertiaKgM2 * (omegaD ** 2 + gamma ** 2);
    return {
      setting: { ...setting, bigG: 1e-5 * CODATA_2022_G.value, oscillator: { ...setting.oscillator, gamma, kappa } },
      fromDeg,
      toDeg,
    };
  };
  const of = ({ setting: { oscillator } }: Rig) => Math.hypot(1, oscillator.gamma / omegaD);

  test.each([
    [0, [0.5, 0.5], [0.25, 0.5, 0.25]],
    [0.01, [0.5078537283653, 0.4921462716347], [0.2579154094145, 0.4998766379015, 0.242207952684]],
    [0.0625, [0.5490255177287, 0.4509744822713], [0.3014290191173, 0.4951929972229, 0.2033779836599]],
    [0.1, [0.5782861816536, 0.4217138183464], [0.3344149078915, 0.4877425475242, 0.1778425445843]],
  ])('at a damping ratio of %d two moves go %p of the step and three %p', (zeta, two, three) => {
    const at = weak(zeta);
    for (const [moves, published] of [
      [2, two],
      [3, three],
    ] as const) {
      const found = shapedSwing({ ...at, slew: instant, moves });
      if ('why' in found) throw new Error(found.why);
      const rests = [at.fromDeg, ...found.moves.map(({ toDeg }) => toDeg)].map((deg) => standingAt(at.setting, deg).restRad);
      const stepRad = (rests.at(-1) as number) - (rests[0] as number);
      published.forEach((share, k) => expect(((rests[k + 1] as number) - (rests[k] as number)) / stepRad).toBeCloseTo(share, 5));
      found.moves.forEach(({ startS }, k) => expect(startS / 210).toBeCloseTo(k, 5));
    }
  });

  const K = 0.8214089649912;
  test.each([
    [-0.1, 0.1427721056389, 0.02038387414856, 0.164571149426],
    [-0.05, 0.07125460260447, 0.005077218392322, 0.1112274509749],
    [-0.02, 0.02844231712201, 0.0008089654032691, 0.09219960689172],
    [0, 0, 0, 0.08929551750439],
    [0.02, 0.02833062549251, 0.000802624340797, 0.09524481213238],
    [0.05, 0.07055712792491, 0.004978308301012, 0.1171101069922],
    [0.1, 0.1399907397582, 0.01959740721804, 0.1708107826387],
  ])('made for a period %d too long, two moves leave %d of the step, three %d, two equal ones %d', (e, two, three, equal) => {
    const at = weak(0.0625);
    const left = (levels: readonly number[]) => residualOf({ at }, movesOf({ at, levels, periodS: 420 * (1 + e) })) / of(at);
    expect(left(fractions[2](K))).toBeCloseTo(two, 5);
    expect(left(fractions[3](K))).toBeCloseTo(three, 5);
    expect(left([0.5])).toBeCloseTo(equal, 5);
  });

  test.each([
    [4, 0.0886, 0.00785],
    [6, 0.0296, 0.00088],
    [10, 0.0178, 0.00032],
    [16, 0.0446, 0.002],
    [50, 0.075, 0.0056],
  ])('made for Q %d where it is 8, two moves leave %d of the step and three %d', (quality, two, three) => {
    const at = weak(0.0625);
    const zeta = 1 / (2 * quality);
    const designed = Math.exp((-Math.PI * zeta) / Math.sqrt(1 - zeta * zeta));
    const left = (count: Count) => residualOf({ at }, movesOf({ at, levels: fractions[count](designed), periodS: 420 })) / of(at);
    expect(Math.abs(left(2) - two)).toBeLessThan(6e-5);
    expect(Math.abs(left(3) - three)).toBeLessThan(6e-5);
  });

  // Width of the band of frequencies, over the one designed for, within which at most 5 % are left.
  test.each([
    [2, 0.06368853295],
    [3, 0.2871325863],
  ] as const)('undamped, %d moves leave 5 %% at the ends of a band %d wide', (moves, width) => {
    const at = weak(0);
    const found = shapedSwing({ ...at, slew: instant, moves });
    if ('why' in found) throw new Error(found.why);
    for (const side of [-1, 1]) {
      const share = 1 + (side * width) / 2;
      expect(residualAtPeriod({ ...at, slew: instant }, found.moves, 1 / share - 1)).toBeCloseTo(0.05, 5);
    }
  });
});

describe('moves by the classical rule with the period at the near station (G2 to G4)', () => {
  const K = { W: standingAt(rigs.W.setting, rigs.W.toDeg).halfRatio, N: standingAt(rigs.N.setting, rigs.N.toDeg).halfRatio };
  const ruleOf = (name: 'W' | 'N', count: Count, e = 0): Rule => ({
    at: rigs[name],
    levels: fractions[count](K[name]),
    periodS: rigs[name].nearS * (1 + e),
  });

  test.each([
    ['W', 2, [1.097277043687]],
    ['W', 3, [-4.600363486372, 7.243616334493]],
    ['N', 2, [76.53403276506]],
    ['N', 3, [128.996093752, 42.52885303407]],
  ] as const)('on rig %s stand meanwhile, in %d moves, at %p', (name, count, published) => {
    const between = anglesOf(ruleOf(name, count)).slice(1, -1);
    published.forEach((angleDeg, k) => expect(between[k]).toBeCloseTo(angleDeg, 5));
  });

  const none = undefined;
  // Made for a period that is too long by e: what is left, and the time until the envelope is within 1 %.
  test.each([
    ['W', 0, [1.00196, 0.00433293, 0.0002754], [4917.8, 210, 420]],
    ['W', 0.02, [1.00196, 0.0328732, 0.001031], [4917.8, 1484.5, 428.4]],
    ['W', 0.05, [1.00196, 0.0754125, 0.005501], [4917.8, 2377.1, 441]],
    ['W', 0.1, [1.00196, 0.14533, 0.0207], [4917.8, 3087.9, 1238.5]],
    ['W', -0.05, [none, 0.0674937, 0.004585], []],
    ['N', 0, [1.00198, 0.00537401, 0.0005319], [4917.8, 210.9, 421.8]],
    ['N', 0.02, [none, 0.0339384, 0.001111], [4917.8, 1519.5, 430.3]],
    ['N', 0.05, [none, 0.0765124, 0.005493], [4917.8, 2393.5, 442.9]],
    ['N', 0.1, [none, 0.146477, 0.02066], [4917.8, 3097.3, 1238.7]],
    ['N', -0.05, [none, 0.0665263, 0.004567], []],
  ] as const)('on rig %s, the period off by %d: one, two and three moves leave %p and are calm after %p s', (name, e, left, calmS) => {
    for (const count of [1, 2, 3] as const) {
      const rule = ruleOf(name, count, e);
      const residual = residualOf(rule, movesOf(rule));
      const published = left[count - 1];
      if (published !== undefined) expect(Math.abs(residual - published)).toBeLessThan(Math.max(2e-3 * published, 1e-6));
      const settledS = (rule.levels.length * rule.periodS) / 2 + Math.max(0, Math.log(residual / 0.01) / rule.at.setting.oscillator.gamma);
      const awaitedS = calmS[count - 1];
      if (awaitedS !== undefined) expect(Math.abs(settledS - awaitedS)).toBeLessThan(2);
    }
  });

  test('with the period and the decay at the angle between, the closed rule leaves a millionth (G2)', () => {
    for (const [name, periodS, angleDeg, published] of [
      ['W', 418.7223445, 1.09395519, 7e-7],
      ['N', 420.2565875, 76.5805244, 1e-6],
    ] as const) {
      const { setting } = rigs[name];
      const between = standingAt(setting, angleDeg);
      expect((2 * Math.PI) / between.omega).toBeCloseTo(periodS, 3);
      const rule: Rule = { at: rigs[name], levels: [1 / (1 + between.halfRatio)], periodS };
      expect(anglesOf(rule)[1]).toBeCloseTo(angleDeg, 4);
      expect(residualOf(rule, movesOf(rule))).toBeLessThan(3 * published);
    }
  });

  /** Starts, middles or torque centroids of the moves half a period apart. */
  function timed(rule: Rule, slew: Slew, by: 'start' | 'middle' | 'centroid'): TimedMove[] {
    if (by === 'centroid') return movesOf(rule, slew);
    const angles = anglesOf(rule);
    const lengths = angles.slice(1).map((toDeg, k) => trapezoid({ fromDeg: angles[k] as number, toDeg, ...slew }).durationS);
    const early = (k: number) => (by === 'start' ? 0 : ((lengths[k] as number) - (lengths[0] as number)) / 2);
    return lengths.map((durationS, k) => ({
      startS: (k * rule.periodS) / 2 - early(k),
      fromDeg: angles[k] as number,
      toDeg: angles[k + 1] as number,
      durationS,
    }));
  }

  // a / v in deg/s² and deg/s; timed by start, by middle and by torque centroid.
  test.each([
    [4, 8, ['.0039', '.0030', '.0044'], ['.0011', '.0000', '.0003'], ['.012', '.023', '.0055'], ['.032', '.0045', '.0008']],
    [1, 3, ['.0151', '.0126', '.0045'], ['.0030', '.0005', '.0003'], ['.021', '.052', '.0057'], ['.085', '.012', '.0042']],
    [0.5, 1.5, ['.0325', '.0275', '.0046'], ['.0062', '.0013', '.0003'], ['.037', '.096', '.0081'], ['.168', '.027', '.016']],
    [0.2, 1, ['.0510', '.0436', '.0046'], ['.0095', '.0021', '.0003'], ['.053', '.140', '.014'], ['.247', '.049', '.036']],
  ])('at %d deg/s² and %d deg/s leave, on W, %p in two moves and %p in three, on N %p and %p (G3)', (a, v, w2, w3, n2, n3) => {
    const slew = { accelerationDegS2: a, speedDegS: v };
    for (const [name, count, row] of [
      ['W', 2, w2],
      ['W', 3, w3],
      ['N', 2, n2],
      ['N', 3, n3],
    ] as const) {
      const rule = ruleOf(name, count);
      (['start', 'middle', 'centroid'] as const).forEach((by, k) => {
        const printed = row[k] as string;
        // Half a unit of the last digit, and a little.
        const tolerance = 0.7 * 10 ** -(printed.length - 1);
        expect(Math.abs(residualOf(rule, timed(rule, slew, by), slew) - Number(printed))).toBeLessThan(tolerance);
      });
    }
  });

  test.each([
    [4, 8, 4.7, 4.4],
    [1, 3, 10.1, 9.4],
    [0.5, 1.5, 17.2, 15.7],
    [0.2, 1, 26.3, 24.1],
  ])('take on rig W, at %d deg/s² and %d deg/s, %d s and %d s (G3)', (accelerationDegS2, speedDegS, first, second) => {
    const moves = movesOf(ruleOf('W', 2), { accelerationDegS2, speedDegS });
    expect(Math.abs((moves[0]?.durationS ?? 0) - first)).toBeLessThan(0.06);
    expect(Math.abs((moves[1]?.durationS ?? 0) - second)).toBeLessThan(0.06);
  });
});
