import { losses, tryBusy, tryLoss } from '@/scripts/soak/heartbeat/try-loss';

/** The sign of life that the controller needs in a motion, lost or late, in a time that is invented: a slice of `npm run soak -- r6`. */

const EACH = 125;
const seeds = Array.from({ length: EACH }, (_, index) => index + 1);

test.each(losses)('%s: the table stands within 2 s and its ramp, and stays there when the sign of life is back', async (loss) => {
  for (const seed of seeds) expect(await tryLoss(loss, seed)).toEqual([]);
});

test('a busy server that is late with everything never loses a swing', async () => {
  for (const seed of seeds) expect(await tryBusy(seed)).toEqual([]);
});

test('a standstill that comes too late is seen, and so is a server that was late for too long', async () => {
  for (const loss of losses) expect(await tryLoss(loss, 1, 700)).toEqual([expect.stringMatching(/it stood after \d+ ms only$/)]);
  expect(await tryBusy(1, 3_000)).toEqual([expect.stringContaining('the lease lapsed')]);
});
