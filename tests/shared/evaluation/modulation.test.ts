import type { BuildArchiveInput } from '@/shared/archive/build-archive';
import { Pendulum, type PendulumSetting } from '@/shared/physics/pendulum';
import { steadyAt, steadyRotation } from '@/shared/physics/steady-rotation';
import { oscillatorOf, type Oscillator } from '@/shared/physics/oscillator';
import { geometryOf } from '@/shared/physics/torque';
import type { RigDocument } from '@/shared/rig/document';
import { relativeDifference } from '../../support/check-data';
import { evaluateNight } from '../../support/evaluate-night';
import { normalDeviates } from '../../support/lcg';
import { nightStartUtcMs, type NightPlan } from '../../support/night';
import { wideRig, withRig } from '../../support/reference-rigs';

/** Sources that turn at a constant rate. Noise-free records give back the G they were made with. */

const trueG = 6.6743e-11;
const motion = { stepsPerDegree: 64, minDeg: -175, maxDeg: 175, maxSpeed_deg_s: 6, maxAcceleration_deg_s2: 2, homeDeg: 0 };
const turning = (change: (rig: RigDocument) => void = () => undefined) =>
  withRig(wideRig(), (rig) => {
    rig.motion = motion;
    change(rig);
  });

/** So many turns in `turnS` each, from rest at the angle where they begin. */
function rotation(turns: number, turnS: number, more: Partial<NightPlan> = {}): NightPlan {
  return {
    anglesDeg: [90, 90 + 360 * turns],
    dwellS: 30,
    speedDegS: 360 / turnS,
    rig: turning(),
    ...more,
    row: (row) => (row.kind === 'swing' ? { kind: 'rotate' } : { kind: 'settle', good: null }),
  };
}

const evaluated = (plan: NightPlan) => evaluateNight(plan, { method: 'modulation' }).result;
/** Off the true G, of it. */
const error = (plan: NightPlan) => relativeDifference(evaluated(plan).G?.value ?? NaN, trueG);
const base = rotation(6, 900);

describe('the steady answer to sources that turn', () => {
  const setting: PendulumSetting = { geometry: geometryOf(wideRig()), oscillator: oscillatorOf(wideRig()) as Oscillator, bigG: trueG };

  test.each([
    [3600, 1.056841028377, -0.03076912174996, 4.53308180089e-11],
    [840, 8.011744562232, -1.539495338649, 4.53308180089e-11],
  ])('a turn in %d s: gain and phase of the first harmonic (physics.md B6)', (turnS, gain, phase, torque) => {
    const weak = 1e-4;
    const { cosine, sine } = steadyRotation({ ...setting, bigG: weak * trueG }, (2 * Math.PI) / turnS);
    const [a, b] = [cosine[0] as number, sine[0] as number];
    expect(relativeDifference((Math.hypot(a, b) * setting.oscillator.kappa) / (weak * torque), gain)).toBeLessThan(1e-6);
    expect(Math.abs(Math.atan2(a, b) - phase)).toBeLessThan(1e-6);
  });

  test('is a motion that the exact equation keeps up', () => {
    const speed = (2 * Math.PI) / 900;
    const steady = steadyRotation(setting, speed);
    const { angleRad, slope } = steadyAt(steady, 0.3);
    const pendulum = new Pendulum({ ...setting, stepInMotionS: 0.5 }, { angleRad, speedRadS: slope * speed });
    pendulum.advanceTo(450, (atS) => 0.3 + speed * atS);
    expect(Math.abs(pendulum.angleRad - angleRad)).toBeLessThan(1e-8 * Math.abs(steady.sine[0] as number));
  });
});

test.each<[string, NightPlan]>([
  ['six turns of a quarter of an hour', base],
  ['clockwise', rotation(-3, 1800)],
  ['at the pendulum’s own frequency', rotation(5, 840)],
  ['read by a spot on a scale whose zero nobody knows', { ...base, unit: 'mm', reading: (angle) => 31 + 5000 * Math.tan(2 * angle) }],
  ['with a zero that drifts', { ...base, reading: (angle, tS) => angle + 1e-4 + 3e-8 * tS }],
])('%s: G to 1e-7', (_name, plan) => {
  expect(error(plan)).toBeLessThan(1e-7);
});

test('a channel whose clock is 2.5 s late is told by the phase, and does not change G', () => {
  const plan: NightPlan = { ...base, channelLateS: 2.5 };
  const { alignment } = evaluated(plan);
  expect(alignment?.applied).toBe(true);
  expect(alignment?.clockOffset_s?.value).toBeCloseTo(2.5, 4);
  expect(error(plan)).toBeLessThan(1e-7);
});

describe('with noise', () => {
  const normal = normalDeviates(47);
  const rig = turning((one) => {
    Object.assign(one.sources.orbit as object, { u: 1e-4 });
    Object.assign(one.measured?.period_s as object, { u: 0.1 });
    Object.assign(one.measured?.decayTime_s as object, { u: 20 });
  });
  const noisy = evaluated({ ...base, rig, reading: (angle) => angle + 5e-6 * normal() });

  test('G is known as well as it scatters, by geometry, turns, period and decay', () => {
    const { value, u } = noisy.G as { value: number; u: number };
    expect(Math.abs(value - trueG)).toBeLessThan(4 * u);
    const lines = new Map((noisy.budget ?? []).map((line) => [line.input, line]));
    // The pull at twice the angle goes with orbit⁻³ from afar, and with orbit⁻⁴·⁷ at the angle of greatest torque (physics.md F4).
    const byOrbit = ((lines.get('sources.orbit')?.sensitivity ?? 0) * 0.125) / trueG;
    expect(byOrbit).toBeGreaterThan(3);
    expect(byOrbit).toBeLessThan(4.7);
    // 5 µrad at 0.5 Hz over five turns of 900 s, an amplitude of 1.3 mrad: √(2/2250) · 5e-6 / 1.3e-3 of it at the least.
    const turns = lines.get('modulation_rad');
    expect((turns?.u ?? 0) / (turns?.value ?? 1)).toBeGreaterThan(3e-5);
    expect((turns?.u ?? 0) / (turns?.value ?? 1)).toBeLessThan(6e-4);
    expect(lines.get('period_s')?.contribution).toBeGreaterThan(0);
    expect(lines.get('decayTime_s')?.contribution).toBeGreaterThan(0);
    expect(noisy.modulation).toMatchObject({ turns: 5, amplitude_rad: { u: expect.any(Number) as number } });
  });

  test('a clock that is poorly known is told in words of the turns, not of shaped swings', () => {
    const unsure = structuredClone(rig);
    Object.assign(unsure.measured?.decayTime_s as object, { u: 400 });
    const { warnings } = evaluated({ ...base, rig: unsure, reading: (angle) => angle + 5e-6 * normal() });
    const message = warnings.find(({ code }) => code === 'clock-poorly-known')?.message ?? '';
    expect(message).toMatch(/poorly known: u \d+\.\d s\. A rotation tells it by the phase/);
    expect(message).toContain('It does no harm to G of this method');
    expect(message).not.toContain('haped swings');
  });

  test('a minute of 200 µrad does no harm', () => {
    const burst = (tS: number) => (tS > 2000 && tS < 2060 ? 2e-4 : 0);
    const { value, u } = evaluated({ ...base, rig, reading: (angle, tS) => angle + burst(tS) + 5e-6 * normal() }).G as {
      value: number;
      u: number;
    };
    expect(Math.abs(value - trueG)).toBeLessThan(4 * u);
    expect(u).toBeLessThan(2 * (noisy.G?.u ?? 0));
  });
});

/** Only those samples of the channel are there, by instant of the night (s) and place. */
const only =
  (there: (tS: number, i: number) => boolean) =>
  (input: BuildArchiveInput): BuildArchiveInput => {
    const channels = input.channels.map(({ utcMs, value, ...channel }) => {
      const kept = (_: number, i: number) => there(((utcMs[i] as number) - nightStartUtcMs) / 1000, i);
      return { ...channel, utcMs: utcMs.filter(kept), value: value.filter(kept) };
    });
    return { ...input, channels };
  };

test('a channel that was silent for more than a turn costs those turns and nothing else', () => {
  const { G, modulation } = evaluateNight(
    base,
    { method: 'modulation' },
    only((tS) => tS < 1900 || tS > 3300),
  ).result;
  expect(relativeDifference(G?.value ?? NaN, trueG)).toBeLessThan(1e-7);
  expect(modulation?.turns).toBe(3);
});

test('turns in which the channel told half as much as before are there all the same', () => {
  const { G, modulation } = evaluateNight(
    base,
    { method: 'modulation' },
    only((tS, i) => tS < 3000 || i % 2 === 0),
  ).result;
  expect(relativeDifference(G?.value ?? NaN, trueG)).toBeLessThan(1e-4);
  expect(modulation?.turns).toBe(5);
});

test('a record of more turns than are looked at one by one: G to 1e-7, its zero drifting', () => {
  expect(error({ ...rotation(29, 450), reading: (angle, tS) => angle + 3e-8 * tS })).toBeLessThan(1e-7);
});

test('turning back is not evaluated: what it shows does not count', () => {
  const back: NightPlan = { ...base, anglesDeg: [90, 90 + 3 * 360, 90] };
  const result = evaluated({ ...back, reading: (angle, tS) => (tS > 2760 ? 0 : angle) });
  expect(result.modulation?.turns).toBe(2);
  expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-7);
});

/** What is shown from that second on is no deflection at all. */
const silentFrom = (fromS: number, anglesTurns: number[]): NightPlan => ({
  ...base,
  anglesDeg: anglesTurns.map((turns) => 90 + 360 * turns),
  reading: (angle, tS) => (tS > fromS ? 0 : angle),
});

test.each<[string, NightPlan, number]>([
  ['a way out that was held and went on', silentFrom(3690, [0, 2.4, 4, 0]), 3],
  ['a way back that was held and went on', silentFrom(2760, [0, 3, 1.6, 0]), 2],
])('turning back is not evaluated after %s', (_name, plan, turns) => {
  const { G, modulation } = evaluated(plan);
  expect(modulation?.turns).toBe(turns);
  expect(relativeDifference(G?.value ?? NaN, trueG)).toBeLessThan(1e-7);
});

test('a way back that was broken off is not evaluated', () => {
  const plan = silentFrom(2760, [0, 3, 1.6]);
  const cut: NightPlan = {
    ...plan,
    row: (row) => (row.seq === 3 ? { kind: 'rotate', outcome: 'cut short' } : (plan.row?.(row) ?? {})),
  };
  const { G, modulation } = evaluated(cut);
  expect(modulation?.turns).toBe(2);
  expect(relativeDifference(G?.value ?? NaN, trueG)).toBeLessThan(1e-7);
});

test('turns against turns that do not come back to where those began are turns of their own', () => {
  const { G, modulation } = evaluated({ ...base, anglesDeg: [90, 90 + 3 * 360, 90 - 2 * 360] });
  expect(modulation?.turns).toBe(6);
  expect(relativeDifference(G?.value ?? NaN, trueG)).toBeLessThan(1e-7);
});

test('a reversed scale is told by the sign of G, and that there are no near and far dwells is nothing to warn of', () => {
  const swung: NightPlan = { ...base, anglesDeg: [60, 90, 90 + 3 * 360], reading: (angle) => -angle };
  const kindOf = { 1: 'swing', 3: 'rotate' } as const;
  const { G, warnings } = evaluated({ ...swung, row: ({ seq }) => ({ kind: kindOf[seq as 1 | 3] ?? 'settle', good: null }) });
  // Mirrored, the motion is not quite that of sources that repel: the pull goes with φ − θ.
  expect(relativeDifference(G?.value ?? NaN, -trueG)).toBeLessThan(0.02);
  expect(warnings.map(({ code }) => code)).toEqual(expect.arrayContaining(['sign']));
  expect(warnings.map(({ code }) => code)).not.toContain('few-dwells');
});

test('is refused without a whole turn between the ramps', () => {
  expect(() => evaluated(rotation(1, 900))).toThrow('steps.csv: the method "modulation" needs a rotation');
});
