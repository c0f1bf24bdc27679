import { remainingFacts, type Remaining } from '@/components/runs/reviewed-act';
import type { RunView } from '@/shared/contracts/runs';
import { startUtcMs, timeZone, viewAt } from '../fixtures/run';

/** What a review of a run that goes on says of the plan and of what was reached. */

const review: Remaining = {
  ...{ token: 't', dwellsLeft: 13, finishAt: new Date(startUtcMs + 3_600_000).toISOString(), next: null, firstMove: 'to far' },
  plannedU: { soFar: 0.0123, atEnd: 0.0101 },
};
const said = (reversal: RunView['reversal'], of: Remaining | null = review) =>
  Object.fromEntries(remainingFacts(of, { view: { ...viewAt(startUtcMs), reversal }, timeZone, serverNowMs: startUtcMs }));

test('pairs left, the finish, and u by the plan beside u as measured', () => {
  const facts = said({ differenceRad: 1e-3, relativeU: 0.0042, reversals: 5 });
  expect(facts).toMatchObject({
    Left: '13 dwells, 6 pairs',
    'u of near − far, measured': expect.stringMatching(/^0\.42.%.* so far, by 5 reversals$/),
  });
  expect(facts['u of G by the plan']).toMatch(/^1\.2.%.* now, 1\.0.%.* at the end$/);
});

test('while too little is measured it says so, also before the plan has come', () => {
  const name = 'u of near − far, measured';
  expect(said(null)[name]).toBe('no good pair yet');
  expect(said({ differenceRad: 1e-3, relativeU: null, reversals: 1 })[name]).toBe('too few dwells to tell, by 1 reversal');
  expect(said(null, null)).toMatchObject({ Left: '…', [name]: 'no good pair yet' });
});
