import { eventFacts } from '@/components/runs/event-facts';
import { eventWords } from '@/components/runs/run-words';

test('a link that came back shows its gap rounded, with the unit', () => {
  expect(eventFacts({ bootId: '0E9F6701', firmware: 'simulated', gapS: 1.829692653 })).toBe(
    'boot id 0E9F6701 · firmware simulated · gap 1.8 s',
  );
});

test('angles carry their unit, and what the row says already is not repeated', () => {
  expect(eventFacts({ seq: 4, path: '4.swing', outcome: 'done', angleDeg: -20.18 })).toBe('outcome done · angle −20.18°');
});

test('what is empty is left out and a truth is said in a word', () => {
  expect(eventFacts({ reason: '', code: null, confirmed: true })).toBe('confirmed yes');
});

test('an edge that was never told is said not to be measured, with how far it may lie off', () => {
  expect(eventWords('edge-not-told')).toContain('Not measured');
  expect(eventFacts({ seq: 4, path: '4.swing', edge: 'began', spanS: 7.01 })).toBe('motion began · somewhere within 7.0 s');
});

test('the tests of a proof are read as their words', () => {
  const tests = [
    { test: 'sign', ok: true, words: 'near lies on its side of far' },
    { test: 'period', ok: null, words: 'the period cannot be told' },
  ];
  expect(eventFacts({ seq: 6, path: '6.proof', sound: false, tests })).toBe(
    'sound no · tests near lies on its side of far; the period cannot be told',
  );
});
