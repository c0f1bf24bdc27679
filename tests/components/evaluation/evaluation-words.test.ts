import { enWords, registeredWords, unitOfInput } from '@/components/evaluation/evaluation-words';
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
