import { wrongWith } from '@/scripts/soak/run/checks';
import { runNight, type Night } from '@/scripts/soak/run/night';
import { tryFirst } from '@/scripts/soak/seeded/try-seeds';

/** Whole nights with mixed faults from seeds: a slice of `npm run soak -- r1`. More by `EVENFALL_NIGHTS`. */
const NIGHTS = Number(process.env['EVENFALL_NIGHTS'] ?? 500);

test(`${NIGHTS} nights: nothing is lost, nothing moves twice, what rests stays at rest`, async () => {
  const ends = new Set<string>();
  const wrong = await tryFirst(NIGHTS, async (seed) => {
    const night = await runNight(seed);
    ends.add(night.healed);
    return wrongWith(night);
  });
  expect(wrong).toEqual([]);
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
    noLateResume: ({ world: { store, witness } }) => {
      witness.resumesFromAfar.push({ by: 'Ilse', atMs: 9_000, ageMs: 5_001, setMs: 0, acted: true });
      Object.assign(store.events[2] as object, { kind: 'resumed', data: { by: 'Ilse' } });
    },
    acknowledgedOnce: ({ world: { store, witness } }) => {
      witness.acknowledged.push({ act: 'stop', by: 'Ilse' });
      for (const event of store.events.slice(2, 4)) Object.assign(event, { kind: 'stop-requested', data: { by: 'Ilse' } });
    },
    saidWhenConfirmed: ({ world, stoodDeg }) => void world.witness.stoppedSaid.push({ atMs: 1e9, angleDeg: stoodDeg[0] - 0.01 }),
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
