import { tryFile } from '@/scripts/soak/import/try-file';
import { tryFirst } from '@/scripts/soak/seeded/try-seeds';

/** Files of every kind: a slice of `npm run soak -- r10`. */
const cases = Number(process.env.EVENFALL_FUZZ ?? 5000);

test(`${String(cases)} files of every kind are read or refused, and no sample of them is unsound`, async () => {
  expect(await tryFirst(cases, tryFile)).toEqual([]);
}, 120_000);
