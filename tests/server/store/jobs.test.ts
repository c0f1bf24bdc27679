import { eq } from 'drizzle-orm';
import { jobs } from '@/db/schema';
import { createJobQueue, enqueueJob } from '@/server/store/jobs';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs } from './rows';

const database = databaseOfThisFile();
let nowUtcMs = eveningUtcMs;
const queue = (holder = 'worker') => createJobQueue(database().connection.db, holder, () => nowUtcMs);
const ask = (payload: unknown, more: { dueAtUtcMs?: number; maxAttempts?: number } = {}) =>
  enqueueJob(database().connection.db, { kind: 'mail', payload, labId: null, nowUtcMs, ...more });
const rowOf = async (id: string) => (await database().connection.db.select().from(jobs).where(eq(jobs.id, id)))[0];

beforeEach(async () => {
  nowUtcMs = eveningUtcMs;
  await database().connection.db.delete(jobs);
});

test('a job is taken once, the oldest first, and done', async () => {
  await ask({ n: 2 }, { dueAtUtcMs: nowUtcMs - 1 });
  const { id } = await ask({ n: 1 }, { dueAtUtcMs: nowUtcMs - 2 });
  const job = await queue().take(['mail']);
  expect(job).toMatchObject({ id, payload: { n: 1 }, attempt: 1 });
  expect((await queue().take(['mail']))?.payload).toEqual({ n: 2 });
  expect(await queue().take(['mail'])).toBeNull();
  if (job !== null) await queue().finish(job);
  expect(await rowOf(id)).toMatchObject({ state: 'done', finishedAt: eveningUtcMs });
});

test('kinds nobody asked for and jobs of later are left alone', async () => {
  await ask({}, { dueAtUtcMs: nowUtcMs + 1 });
  expect(await queue().take(['mail'])).toBeNull();
  nowUtcMs += 1;
  expect(await queue().take(['evaluation'])).toBeNull();
  expect(await queue().take(['evaluation', 'mail'])).not.toBeNull();
});

test('many workers at once never take the same job', async () => {
  for (let n = 0; n < 20; n += 1) await ask({ n });
  const taken = await Promise.all(Array.from({ length: 25 }, (_, n) => queue(`worker ${n}`).take(['mail'])));
  const ids = taken.flatMap((job) => (job === null ? [] : [job.id]));
  expect(new Set(ids).size).toBe(ids.length);
  expect(ids.length).toBe(20);
});

test('a worker that dies loses its job after 30 s, and may not report on it later', async () => {
  const { id } = await ask({});
  const dead = await queue('dead').take(['mail']);
  nowUtcMs += 29_999;
  expect(await queue().take(['mail'])).toBeNull();
  nowUtcMs += 1;
  const again = await queue('living').take(['mail']);
  expect(again).toMatchObject({ id, attempt: 2 });
  if (dead !== null) {
    expect(await queue('dead').renew(dead)).toBe(false);
    await queue('dead').finish(dead);
  }
  expect(await rowOf(id)).toMatchObject({ state: 'running', holder: 'living' });
});

test('a renewed lease holds', async () => {
  await ask({});
  const job = await queue().take(['mail']);
  nowUtcMs += 20_000;
  expect(job !== null && (await queue().renew(job))).toBe(true);
  nowUtcMs += 20_000;
  expect(await queue().take(['mail'])).toBeNull();
});

test('failures are tried again after 5, 10, 20 s and given up after the last', async () => {
  const { id } = await ask({}, { maxAttempts: 3 });
  for (const waitMs of [5000, 10_000]) {
    const job = await queue().take(['mail']);
    if (job !== null) await queue().fail(job, 'the mail server refused');
    nowUtcMs += waitMs - 1;
    expect(await queue().take(['mail'])).toBeNull();
    nowUtcMs += 1;
  }
  const last = await queue().take(['mail']);
  expect(last?.attempt).toBe(3);
  if (last !== null) await queue().fail(last, 'the mail server refused');
  expect(await rowOf(id)).toMatchObject({ state: 'given-up', lastError: 'the mail server refused' });
  nowUtcMs += 86_400_000;
  expect(await queue().take(['mail'])).toBeNull();
});

test('a job that is given back is due at once, and the attempt does not count', async () => {
  const { id } = await ask({}, { maxAttempts: 1 });
  for (let ends = 0; ends < 3; ends += 1) {
    const job = await queue().take(['mail']);
    expect(job).toMatchObject({ id, attempt: 1 });
    if (job !== null) await queue().giveBack(job);
  }
  expect(await rowOf(id)).toMatchObject({ state: 'waiting', attempts: 0 });
});

test('a job that kills its worker each time is given up too', async () => {
  const { id } = await ask({}, { maxAttempts: 2 });
  for (let n = 0; n < 2; n += 1) {
    expect(await queue().take(['mail'])).not.toBeNull();
    nowUtcMs += 30_000;
  }
  expect(await queue().take(['mail'])).toBeNull();
  expect(await rowOf(id)).toMatchObject({ state: 'given-up' });
});

test('a job of a transaction that is rolled back was never asked for', async () => {
  const { db } = database().connection;
  await expect(
    db.transaction(async (tx) => {
      await enqueueJob(tx, { kind: 'mail', payload: {}, labId: null, nowUtcMs });
      throw new Error('no');
    }),
  ).rejects.toThrow('no');
  expect(await queue().take(['mail'])).toBeNull();
});
