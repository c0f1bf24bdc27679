import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { allKinds } from '@/scripts/soak/seeded/all-kinds';
import { failingSeeds, keepFailingSeed } from '@/scripts/soak/seeded/failing-seeds';
import { tryFirst, trySeed } from '@/scripts/soak/seeded/try-seeds';

/** Every seed that ever failed in a soak is played again, for ever. */
test.each(failingSeeds())('$soak, $kind, seed $seed', async ({ soak, kind, seed }) => {
  const known = allKinds[soak]?.[kind];
  // A kind that was given another name takes its seeds along.
  expect({ soak, kind, known: known !== undefined }).toEqual({ soak, kind, known: true });
  if (known !== undefined) expect(await trySeed(known.attempt, seed)).toEqual([]);
});

describe('a seed that fails', () => {
  const folder = mkdtempSync(join(tmpdir(), 'evenfall-seeds-'));
  const file = join(folder, 'failing-seeds.json');
  afterAll(() => rmSync(folder, { recursive: true }));

  test('is kept once, in order, beside those of other soaks', () => {
    writeFileSync(file, '{"r1":{"night":[7]}}');
    for (const seed of [12, 3, 12]) keepFailingSeed({ soak: 'r1', kind: 'night', seed }, file);
    keepFailingSeed({ soak: 'r6', kind: 'line cut', seed: 5 }, file);
    expect(failingSeeds(file)).toEqual([
      ...[3, 7, 12].map((seed) => ({ soak: 'r1', kind: 'night', seed })),
      { soak: 'r6', kind: 'line cut', seed: 5 },
    ]);
  });

  test('is told, also where its case breaks off, and those after it are tried all the same', async () => {
    const tried: number[] = [];
    const wrong = await tryFirst(4, (seed) => {
      tried.push(seed);
      if (seed === 2) throw new Error('no such row');
      return seed === 3 ? ['seed 3: it moved twice'] : [];
    });
    expect(tried).toEqual([1, 2, 3, 4]);
    expect(wrong).toEqual([expect.stringMatching(/^seed 2 broke off: Error: no such row/), 'seed 3: it moved twice']);
  });
});
