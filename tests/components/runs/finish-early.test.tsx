import { askedWords } from '@/components/runs/finish-early';

const predictedEndAt = '2031-02-15T02:30:00.000Z';
const words = (finishing: { by: string; overBy: string | null }) => askedWords({ predictedEndAt }, finishing, 'UTC');

test('why a run ends early is told with when it is over, and who or what decided', () => {
  expect(words({ by: 'Ben', overBy: null })).toBe(
    'The run ends with the pair under way, as Ben asked: no other pair begins. It is over at about 02:30.',
  );
  expect(words({ by: '', overBy: '2031-02-15T05:00:00.000Z' })).toMatch(
    /^The run ends on a whole pair before the night window does, at 05:00\./,
  );
  expect(words({ by: '', overBy: null })).toMatch(/^Few of the dwells are good, so .* It is over at about 02:30\. .* let it go on\.$/);
});
