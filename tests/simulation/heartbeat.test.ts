import { losses, tryBusy, tryLoss } from '@/scripts/soak/heartbeat/try-loss';
import { tryFirst } from '@/scripts/soak/seeded/try-seeds';

/** The sign of life that the controller needs in a motion, lost or late, in a time that is invented: a slice of `npm run soak -- r6`. */

const EACH = 125;

test.each(losses)('%s: the table stands within 2 s and its ramp, and stays there when the sign of life is back', async (loss) => {
  expect(await tryFirst(EACH, (seed) => tryLoss(loss, seed))).toEqual([]);
});

test('a busy server that is late with everything never loses a swing', async () => {
  expect(await tryFirst(EACH, (seed) => tryBusy(seed))).toEqual([]);
});

test('a standstill that comes too late is seen, and so is a server that was late for too long', async () => {
  for (const loss of losses) expect(await tryLoss(loss, 1, 700)).toEqual([expect.stringMatching(/it stood after \d+ ms only$/)]);
  expect(await tryBusy(1, 3_000)).toEqual([expect.stringContaining('the lease lapsed')]);
});
