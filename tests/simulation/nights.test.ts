import type { ArmedRig } from '@/scripts/soak/run/armed-rig';
import { wrongWith } from '@/scripts/soak/run/checks';
import { runNight, type Night } from '@/scripts/soak/run/night';
import { tryFirst } from '@/scripts/soak/seeded/try-seeds';

/** Whole nights with mixed faults from seeds: a slice of `npm run soak -- r1`. More by `EVENFALL_NIGHTS`. */
const NIGHTS = Number(process.env['EVENFALL_NIGHTS'] ?? 500);
const ARMED_NIGHTS = Math.ceil(NIGHTS / 4);

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

test(`${ARMED_NIGHTS} nights with people at the rig: nothing moves without somebody who answers for it, or under a personal lock`, async () => {
  const seen = { lifted: 0, armedAgain: 0, missed: 0, moved: 0 };
  const wrong = await tryFirst(ARMED_NIGHTS, async (seed) => {
    const night = await runNight(seed, { isArmed: true });
    const { locks = [], asked = [], start = null } = night.world.rig?.witness ?? {};
    seen.lifted += locks.filter(({ liftedMs }) => liftedMs !== null).length;
    seen.armedAgain += Math.max(0, asked.length - 1);
    seen.missed += start?.beganMs === null ? 1 : 0;
    seen.moved += night.world.witness.began.length;
    return wrongWith(night);
  });
  expect(wrong).toEqual([]);
  expect(Math.min(...Object.values(seen))).toBeGreaterThan(ARMED_NIGHTS / 10);
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

describe('each checker of a rig with people finds a fault that is planted', () => {
  const lock = { id: 'lock 9', setMs: 1e8, atMs: 1e8, liftedMs: null };
  const planted: Record<string, (night: Night, rig: ArmedRig) => void> = {
    movesArmed: ({ world }, { witness }) => {
      // The key was turned off long before the first motion.
      witness.changes.splice(1, 0, { what: 'key', on: false, atMs: (world.witness.began[0]?.atMs ?? 0) - 8_000 });
    },
    restsUnderLock: ({ world: { witness } }, rig) => {
      rig.witness.locks.push(lock);
      rig.kept.locks.push({ ...lock, labId: '', rigId: '', userId: '', name: '', note: '', setUtcMs: 0 });
      witness.ordered.push({ tag: 'late', atMs: 1e9 });
    },
    liftedAtTheRig: (_, { witness }) => void witness.locks.push({ ...lock, liftedMs: 2e8 }),
    locksAreKept: (_, { witness }) => void witness.locks.push(lock),
    startsInTime: (_, { witness }) => Object.assign(witness, { start: { dueMs: 5_000, beganMs: null, why: '' } }),
  };

  test.each(Object.keys(planted))('%s', async (name) => {
    const night = await runNight(12, { isArmed: true });
    expect(wrongWith(night)).toEqual([]);
    planted[name]?.(night, night.world.rig as ArmedRig);
    expect(wrongWith(night).join('\n')).toContain(`, ${name}: `);
  });
});
