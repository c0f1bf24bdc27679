import { isSound, judgeProof, type ProofFacts } from '@/shared/conditions/proof';
import type { DwellFacts } from '@/shared/conditions/dwell-verdict';
import { predictSignal } from '@/shared/protocol/predict';
import { withoutSources } from '@/shared/protocol/templates';
import { demoRigWide } from '@/shared/rig/demo-rigs';

const signal = predictSignal(demoRigWide)?.signalRad ?? 0;
const dwell = (side: 'near' | 'far', change: Partial<DwellFacts> = {}): DwellFacts => ({
  ...{ seq: 1, side, midUtcMs: 0, good: true, why: [], silent: false, noResponse: null, excursion: null, loud: null },
  centreRad: (side === 'near' ? signal : -signal) / 2,
  residualRad: 1e-5,
  period: { value: 420, u: 0.5 },
  ...change,
});
const sound: ProofFacts = { near: dwell('near'), far: dwell('far'), edgeDeg: 0 };
const failing = (facts: ProofFacts, step: object = {}, rig = demoRigWide) =>
  judgeProof({ kind: 'proof', ...step }, rig, facts)
    .filter(({ ok }) => ok !== true)
    .map(({ test }) => test);

/** The bounds of the format: sign, size 0.2, period 0.03, residual 3, edge 0.02 deg. */
test.each<[string, Partial<ProofFacts>, string[]]>([
  ['a sound pair', {}, []],
  ['a mass on the wrong side', { near: dwell('near', { centreRad: -signal / 2 }), far: dwell('far', { centreRad: signal / 2 }) }, ['sign']],
  ['a mass that was not put back', { near: dwell('near', { centreRad: 0.2 * signal }) }, ['size']],
  [
    'a caged pendulum',
    { near: dwell('near', { period: { value: 440, u: 0.5 } }), far: dwell('far', { period: { value: 441, u: 0.6 } }) },
    ['period'],
  ],
  ['a noisy readout', { far: dwell('far', { residualRad: 3.1e-5 }) }, ['residual']],
  ['a table that moved', { edgeDeg: -0.021 }, ['edge']],
  ['a beam that was blocked', { far: dwell('far', { centreRad: null, residualRad: null, period: null }) }, ['sign', 'size', 'residual']],
  ['a dwell that is missing', { far: null }, ['sign', 'size', 'residual']],
])('%s', (_, change, tests) => {
  const facts = { ...sound, ...change };
  expect(failing(facts)).toEqual(tests);
  expect(isSound(judgeProof({ kind: 'proof' }, demoRigWide, facts))).toBe(tests.length === 0);
});

test('null leaves a test out, another bound moves it, and an empty control has neither sign nor size', () => {
  const off: ProofFacts = { ...sound, near: dwell('near', { centreRad: 0.2 * signal }), edgeDeg: 0.1 };
  expect(failing(off)).toEqual(['size', 'edge']);
  expect(failing(off, { size: null, edge_deg: 0.2 })).toEqual([]);
  const empty: ProofFacts = {
    ...sound,
    near: dwell('near', { centreRad: 0, period: null }),
    far: dwell('far', { centreRad: 0, period: null }),
  };
  expect(failing(empty, {}, withoutSources(demoRigWide))).toEqual([]);
});
