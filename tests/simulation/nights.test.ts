import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { wrongWith } from '@/scripts/soak/run/checks';
import { runNight, type Night } from '@/scripts/soak/run/night';

/** Whole nights with mixed faults from seeds: a slice of `npm run soak -- r1`. More by `EVENFALL_NIGHTS`. */
const NIGHTS = Number(process.env['EVENFALL_NIGHTS'] ?? 500);
const kept = JSON.parse(readFileSync(join(__dirname, '../fixtures/failing-seeds.json'), 'utf8')) as { r1: number[] };

test(`${NIGHTS} nights, and every seed that ever failed: nothing is lost, nothing moves twice, what rests stays at rest`, async () => {
  const seeds = [...kept.r1, ...Array.from({ length: NIGHTS }, (_, index) => index + 1)];
  const ends = new Set<string>();
  for (const seed of seeds) {
    const night = await runNight(seed);
    expect(wrongWith(night)).toEqual([]);
    ends.add(night.healed);
  }
  expect([...ends]).toEqual(expect.arrayContaining(['finished', 'held', 'stopped']));
}, 240_000);

test('the same seed leaves the same log, to the last digit', async () => {
  for (const seed of [3, 4, 5]) expect((await runNight(seed)).hash).toBe((await runNight(seed)).hash);
  expect((await runNight(3)).hash).not.toBe((await runNight(6)).hash);
});

describe('each checker finds a fault that is planted', () => {
  const planted: Record<string, (night: Night) => void> = {
    atMostOnce: ({ world: { witness } }) => void witness.began.push({ tag: witness.began[0]?.tag ?? '', atMs: 1 }),
    wholeLog: ({ world: { store } }) => void store.rows.delete(1),
    chainHolds: ({ world: { store } }) => Object.assign(store.events[2] as object, { kind: 'changed' }),
    nothingLost: ({ world: { store } }) => void store.events.splice(2, 1),
    restsAfterHalt: ({ world: { witness } }) => {
      witness.halts.push({ kind: 'stop', atMs: 1e8 });
      witness.ordered.push({ tag: 'late', atMs: 1e9 });
    },
    restsAfterHazard: ({ world: { witness } }) => {
      witness.hazards.push({ kind: 'interlock', atMs: 1e8 });
      witness.began.push({ tag: 'late', atMs: 1e9 });
    },
    goodPassesCounted: ({ world: { store } }) => {
      const dwell = [...store.rows.values()].find(({ kind, outcome }) => kind === 'dwell' && outcome === 'done');
      Object.assign(dwell as object, { good: !(dwell?.good === true) });
    },
    comesToAnEnd: (night) => Object.assign(night, { stoodDeg: [1, 2] }),
  };

  test.each(Object.keys(planted))('%s', async (name) => {
    const night = await runNight(12);
    expect(wrongWith(night)).toEqual([]);
    planted[name]?.(night);
    expect(wrongWith(night).join('\n')).toContain(`, ${name}: `);
  });
});
