import { sql } from 'drizzle-orm';
import { armRig, currentArm, endArm } from '@/server/store/arms';
import { createIdempotency, sweepIdempotencyKeys } from '@/server/store/idempotency';
import { countUse, forgetUses, sweepRateLimits } from '@/server/store/rate-limits';
import {
  drivenRigs,
  giveRigLeases,
  leasesOf,
  renewRigLeases,
  takeRigLease,
  wasGivenBack,
  type SeenLease,
  type Takeable,
} from '@/server/store/rig-leases';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs, makeLab, makeRig, makeUser } from './rows';

const database = databaseOfThisFile();
const db = () => database().connection.db;
const hourMs = 3_600_000;

describe('idempotency keys', () => {
  let nowUtcMs = eveningUtcMs;
  const port = () => createIdempotency(db(), () => nowUtcMs);
  const answer = { status: 201, body: { id: 'run' }, etag: '7' };
  const claimFor = async (key = 'k') => ({ userId: (await makeUser(db())).id, key, fingerprint: 'a' });

  test('the first claims, a repeat gets the first answer, another request is refused', async () => {
    const claim = await claimFor();
    expect(await port().begin(claim)).toEqual({ kind: 'new' });
    expect(await port().begin(claim)).toEqual({ kind: 'running' });
    await port().finish(claim, answer);
    expect(await port().begin(claim)).toEqual({ kind: 'answered', answer });
    expect(await port().begin({ ...claim, fingerprint: 'b' })).toEqual({ kind: 'other-request' });
  });

  test('of ten at the same time exactly one acts', async () => {
    const claim = await claimFor();
    const states = await Promise.all(Array.from({ length: 10 }, () => port().begin(claim)));
    expect(states.filter((state) => state.kind === 'new')).toHaveLength(1);
  });

  test('another person may use the same key', async () => {
    await port().begin(await claimFor('same'));
    expect(await port().begin(await claimFor('same'))).toEqual({ kind: 'new' });
  });

  test('a released key is free; an answered one is not released', async () => {
    const claim = await claimFor();
    await port().begin(claim);
    await port().release(claim);
    expect(await port().begin(claim)).toEqual({ kind: 'new' });
    await port().finish(claim, answer);
    await port().release(claim);
    expect((await port().begin(claim)).kind).toBe('answered');
  });

  test('an answer is kept for 24 h, a claim whose process died for a minute', async () => {
    const claim = await claimFor();
    await port().begin(claim);
    nowUtcMs += 60_000;
    expect(await port().begin(claim)).toEqual({ kind: 'new' });
    await port().finish(claim, answer);
    nowUtcMs += 24 * hourMs - 1;
    expect((await port().begin(claim)).kind).toBe('answered');
    nowUtcMs += 1;
    expect(await port().begin(claim)).toEqual({ kind: 'new' });
  });

  test('old keys are swept', async () => {
    await port().begin(await claimFor());
    nowUtcMs += 25 * hourMs;
    expect(await sweepIdempotencyKeys(db(), nowUtcMs)).toBeGreaterThan(0);
  });
});

describe('rate counters', () => {
  const rule = { name: 'sign-in', limit: 3, windowS: 600 };

  test('the use over the limit is told how long to wait, and the next window begins anew', async () => {
    const use = (afterS: number) => countUse(db(), rule, { subject: 'a@quillfen.example', nowUtcMs: eveningUtcMs + afterS * 1000 });
    expect([await use(0), await use(1), await use(2)]).toEqual([null, null, null]);
    expect(await use(100)).toBe(500);
    expect(await use(599.5)).toBe(1);
    expect(await use(600)).toBeNull();
  });

  test('uses at the same time are all counted', async () => {
    const waits = await Promise.all(Array.from({ length: 10 }, () => countUse(db(), rule, { subject: 'crowd', nowUtcMs: eveningUtcMs })));
    expect(waits.filter((wait) => wait === null)).toHaveLength(3);
  });

  test('subjects and rules do not share a counter, and a success forgets', async () => {
    for (let n = 0; n < 3; n += 1) await countUse(db(), rule, { subject: 'x', nowUtcMs: eveningUtcMs });
    expect(await countUse(db(), { ...rule, name: 'reset' }, { subject: 'x', nowUtcMs: eveningUtcMs })).toBeNull();
    await forgetUses(db(), rule, 'x');
    expect(await countUse(db(), rule, { subject: 'x', nowUtcMs: eveningUtcMs })).toBeNull();
  });

  test('counters of past windows are swept', async () => {
    expect(await sweepRateLimits(db(), eveningUtcMs + hourMs)).toBeGreaterThan(0);
    expect(await sweepRateLimits(db(), eveningUtcMs + hourMs)).toBe(0);
  });
});

describe('arms', () => {
  async function rig() {
    const lab = await makeLab(db());
    return { labId: lab.id, rigId: await makeRig(db(), lab.id), armedById: (await makeUser(db())).id };
  }
  const arm = (where: Awaited<ReturnType<typeof rig>>, name: string, hours: number) =>
    db().transaction((tx) =>
      armRig(tx, { ...where, name, note: '', bootId: '00001A2B', nowUtcMs: eveningUtcMs, untilUtcMs: eveningUtcMs + hours * hourMs }),
    );

  test('an arm holds until its end and no longer', async () => {
    const where = await rig();
    await arm(where, 'Ilse Marrow', 16);
    expect(await currentArm(db(), { ...where, nowUtcMs: eveningUtcMs + 16 * hourMs - 1 })).toMatchObject({ name: 'Ilse Marrow' });
    expect(await currentArm(db(), { ...where, nowUtcMs: eveningUtcMs + 16 * hourMs })).toBeNull();
  });

  test('a new arm ends the one before, and an ended arm is gone', async () => {
    const where = await rig();
    await arm(where, 'Ilse Marrow', 16);
    await arm(where, 'Tam Ferrow', 2);
    expect(await currentArm(db(), { ...where, nowUtcMs: eveningUtcMs })).toMatchObject({ name: 'Tam Ferrow' });
    expect(await endArm(db(), { ...where, nowUtcMs: eveningUtcMs, why: 'interlock' })).toMatchObject({ endedWhy: 'interlock' });
    expect(await currentArm(db(), { ...where, nowUtcMs: eveningUtcMs })).toBeNull();
    expect(await endArm(db(), { ...where, nowUtcMs: eveningUtcMs, why: 'again' })).toBeNull();
  });

  test('no arm lasts longer than 72 h or ends before it begins', async () => {
    const where = await rig();
    await arm(where, 'Ilse Marrow', 72);
    await expect(arm(where, 'Ilse Marrow', 72.001)).rejects.toThrow();
    await expect(arm(where, 'Ilse Marrow', 0)).rejects.toThrow();
    expect(await currentArm(db(), { ...where, nowUtcMs: eveningUtcMs })).not.toBeNull();
  });
});

describe('rig leases', () => {
  test('one holder at a time, each new one with a higher epoch', async () => {
    const lab = await makeLab(db());
    const rigId = await makeRig(db(), lab.id);
    const take = (holder: string, why?: Takeable) => takeRigLease(db(), { labId: lab.id, rigId, holder, leaseMs: 5000, why });
    const seen = async () => (await leasesOf(db(), [rigId]))[0] as SeenLease;
    const clock = () => db().execute<{ ms: string }>(sql`select extract(epoch from clock_timestamp()) * 1000 as ms`);
    const databaseUtcMs = async () => Number((await clock()).rows[0]?.ms);

    const beforeMs = await databaseUtcMs();
    expect(await take('a')).toBe(1);
    expect(await take('b')).toBeNull();
    const first = await seen();
    expect(first).toMatchObject({ rigId, holder: 'a', epoch: 1 });
    expect(first.untilUtcMs).toBeGreaterThanOrEqual(beforeMs + 5000);
    expect(first.untilUtcMs).toBeLessThanOrEqual((await databaseUtcMs()) + 5000);
    expect(await drivenRigs(db())).toEqual(new Set([rigId]));
    expect(await take('a')).toBe(1);
    // It was renewed since it was seen so.
    expect(await take('b', { still: first })).toBeNull();
    expect(await take('b', { still: await seen() })).toBe(2);
    expect(await take('a', { still: first })).toBeNull();
    expect(await take('a')).toBeNull();

    await giveRigLeases(db(), 'b');
    expect(wasGivenBack(await seen())).toBe(true);
    expect(await drivenRigs(db())).toEqual(new Set());
    expect(await take('a')).toBe(3);
    expect(wasGivenBack(await seen())).toBe(false);
    expect(await renewRigLeases(db(), { holder: 'a', leaseMs: 5000 })).toEqual(new Set([rigId]));
    expect(await renewRigLeases(db(), { holder: 'b', leaseMs: 5000 })).toEqual(new Set());
    expect(await take('c', { gone: 'b' })).toBeNull();
    expect(await take('c', { gone: 'a' })).toBe(4);
    expect(await take('b', { gone: 'a' })).toBeNull();
  });
});
