import { monteCarloWords } from '@/shared/evaluation/monte-carlo-words';
import { agreementOf, changeWords, enWords, regressionWords, registeredWords } from '@/components/evaluation/evaluation-words';
import { placeOfWarning } from '@/components/evaluation/warning-places';
import { unitOfInput } from '@/shared/evaluation/input-words';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { protocol } from '../fixtures/run';

test('En within one agrees, beyond one disagrees', () => {
  expect(enWords(-0.1)).toBe('En −0.10 against CODATA 2022: agrees at k = 2');
  expect(enWords(1.4)).toContain('disagrees');
  expect(enWords(null)).toBe('no comparison without an uncertainty');
});

test('what was registered is said, and how the result differs from it', () => {
  expect(registeredWords({ registered: true, method: 'equilibrium' }, protocol, 'deflection')).toEqual({
    words: 'as registered',
    differs: false,
  });
  expect(registeredWords({ registered: false, method: 'equilibrium' }, protocol, 'spot')).toEqual({
    words: 'not as registered: channel spot, registered deflection',
    differs: true,
  });
  // The registered method is equilibrium where none is named.
  const unnamed = { ...protocol, evaluation: { drift: 'aba' as const } };
  expect(registeredWords({ registered: false, method: 'period' }, unnamed, null).words).toBe(
    'not as registered: method period, registered equilibrium',
  );
  expect(registeredWords({ registered: null, method: 'equilibrium' }, protocol, null).words).toBe('no evaluation was registered');
});

test('a budget line has the unit of the quantity it names', () => {
  expect(unitOfInput('sources.orbit', demoRigWide)).toBe('m');
  expect(unitOfInput('stations.near', demoRigWide)).toBe('deg');
  expect(unitOfInput('reversal_rad', demoRigWide)).toBe('rad');
  expect(unitOfInput('no.such', demoRigWide)).toBe('');
});

const plain = (text: string) => text.replaceAll('\u202f', ' ');

test('two methods agree while their difference is within twice its u', () => {
  expect(agreementOf({ value: 4.8e-14, u: 5.1e-14 })).toMatchObject({
    agrees: true,
    words: expect.stringMatching(/En 0.47: agrees at k = 2$/),
  });
  const apart = agreementOf({ value: -2e-13, u: 5e-14 });
  expect(apart.agrees).toBe(false);
  expect(plain(apart.words)).toBe('differs from the result by −2.00(50) × 10⁻¹³ m³ kg⁻¹ s⁻², En −2.0: disagrees at k = 2');
  expect(agreementOf({ value: 1e-14, u: null }).agrees).toBeNull();
});

test('a trial says what it does to G and to its u', () => {
  expect(plain(changeWords({ value: 6.67e-11, u: 6.67e-13 }, { value: 6.7e-11, u: 3.35e-13 }))).toBe(
    '+3.000 × 10⁻¹³ m³ kg⁻¹ s⁻² from the result; u 0.500 % of G instead of 1.00 %',
  );
});

test('how sure it is that the dwells go with a channel is said with the number of dwells', () => {
  const reversal = { reversal_rad: { value: 2e-3, u: 1e-6 }, G: null };
  const one = { channel: 'temperature', unit: 'K', dwells: 12, degreesOfFreedom: 9, without: reversal, with: reversal };
  const words = (value: number) => regressionWords({ ...one, coefficient: { value, u: 1e-6, unit: 'rad/K' } });
  // Student's t with 9 degrees of freedom: 2.262 is the 95 % point.
  expect(plain(words(-2.262e-6))).toBe('pendulum angle over the channel, 12 dwells; chance alone would show as much 5.0 % of the time');
  expect(plain(words(2e-5))).toContain('under 0.1 % of the time');
});

test('a warning leads to where it can be looked at', () => {
  const run = { id: 'r1', rigId: 'g1' };
  expect(placeOfWarning('clock-offset', run)).toMatchObject({ href: '/runs/r1/data' });
  expect(placeOfWarning('sign', run)).toMatchObject({ href: '/rigs/g1/stations' });
  expect(placeOfWarning('not-alternating', run)).toMatchObject({ dwell: true });
  expect(placeOfWarning('no-hashes', run)).toBeNull();
});

test('the ends of a Monte Carlo interval have the u that the number of trials leaves; those of results kept before have as many digits as u', () => {
  const monteCarlo = { trials: 100_000, G_mean: 6.6743e-11, G_u: 1.5e-13, interval95: [6.6449e-11, 6.7037e-11] as [number, number] };
  const words = (interval95_u?: [number, number]) =>
    (monteCarloWords({ monteCarlo: interval95_u === undefined ? monteCarlo : { ...monteCarlo, interval95_u }, G: null }) ?? '').replaceAll(
      /\s/gu,
      ' ',
    );
  expect(words([1.3e-15, 1.3e-15])).toContain('95 % interval from 6.644 90(13) × 10⁻¹¹ m³ kg⁻¹ s⁻² to 6.703 70(13) × 10⁻¹¹ m³ kg⁻¹ s⁻²');
  expect(words()).toContain('95 % interval from 6.645 × 10⁻¹¹ m³ kg⁻¹ s⁻² to 6.704 × 10⁻¹¹ m³ kg⁻¹ s⁻²');
});
