import { randomUUID } from 'node:crypto';
import { pino } from 'pino';
import { RealClock } from '@/server/boot/real-clock';
import type { ProcessMessage, RigQuestion } from '@/server/interfaces/process-post';
import { Pieces, toPieces } from '@/server/store/pieces';
import { DatabasePost } from '@/server/store/process-post';
import { takeRigLease } from '@/server/store/rig-leases';
import { databaseOfThisFile } from '@/tests/support/database';

const posts: DatabasePost[] = [];
// Before the database is dropped.
afterAll(async () => {
  for (const post of posts) await post.close();
});
const database = databaseOfThisFile();

async function opened(process: string): Promise<DatabasePost> {
  const { url, connection } = database();
  const post = new DatabasePost({ process, url, database: connection, clock: new RealClock(), log: pino({ level: 'silent' }) });
  posts.push(post);
  await post.open();
  return post;
}

const heardBy = (post: DatabasePost) => {
  const heard: ProcessMessage[] = [];
  const waiting = new Set<() => void>();
  post.onMessage((message) => {
    heard.push(message);
    for (const wake of waiting) wake();
  });
  const until = async (count: number) => {
    while (heard.length < count) await new Promise<void>((resolve) => void waiting.add(resolve));
    return heard;
  };
  return { heard, until };
};

const question: RigQuestion = { route: 'holdRun', params: { runId: 'r' }, query: {}, body: {}, ifMatch: null, me: null, membership: null };

test('a message of any length and alphabet arrives whole, in order, with the others and not with whoever said it', async () => {
  const [one, other] = [await opened('one'), await opened('other')];
  const [own, others] = [heardBy(one), heardBy(other)];
  const long = { ...question, body: { notes: 'ångström 🜨 \n '.repeat(3_000) } };
  await Promise.all([
    one.tell({ kind: 'urgent', id: '1', to: 'any', question: long }),
    one.tell({ kind: 'jobs' }),
    one.tell({ kind: 'urgent', id: '2', to: { rigId: 'north' }, question }),
  ]);
  expect(await others.until(3)).toEqual([
    { kind: 'urgent', id: '1', to: 'any', question: long },
    { kind: 'jobs' },
    { kind: 'urgent', id: '2', to: { rigId: 'north' }, question },
  ]);
  expect(own.heard).toEqual([]);
});

test('a question is taken once, or withdrawn; its answer is collected once', async () => {
  const [web, rig, other] = [await opened('web'), await opened('rig'), await opened('another rig')];
  const heard = heardBy(rig);
  const key = { labId: randomUUID(), id: randomUUID() };
  await web.ask(question, { ...key, to: { rigId: 'north' } });
  expect(await heard.until(1)).toEqual([{ kind: 'question', ...key, to: { rigId: 'north' } }]);
  const taken = await Promise.all([rig.take(key), other.take(key)]);
  expect(taken.filter((found) => found !== null)).toEqual([question]);
  expect(await web.withdraw(key)).toBe(false);
  expect(await web.collect(key)).toBeNull();
  const answers = heardBy(web);
  const reply = { kind: 'answer' as const, status: 202, body: { serverAt: 'now' }, etag: null };
  await rig.reply(key, reply);
  expect(await answers.until(1)).toEqual([{ kind: 'answered', ...key }]);
  expect(await web.collect(key)).toEqual(reply);
  expect(await web.collect(key)).toBeNull();
  const second = { labId: key.labId, id: randomUUID() };
  await web.ask(question, { ...second, to: 'any' });
  expect(await web.withdraw(second)).toBe(true);
  expect(await rig.take(second)).toBeNull();
});

test('after the line broke it listens again and says that something may have been missed', async () => {
  const [one, other] = [await opened('one'), await opened('other')];
  const gap = new Promise<void>((resolve) => other.onGap(resolve));
  const heard = heardBy(other);
  await database().connection.pool.query(
    "select pg_terminate_backend(pid) from pg_stat_activity where application_name = 'evenfall post' and datname = current_database()",
  );
  await gap;
  expect(other.hears()).toBe(true);
  for (let turn = 0; turn < 40 && !one.hears(); turn += 1) await new Promise((resolve) => setTimeout(resolve, 50));
  await one.tell({ kind: 'jobs' });
  expect(await heard.until(1)).toEqual([{ kind: 'jobs' }]);
});

test('who drives the rigs of a lab is read from the leases that run', async () => {
  const { connection } = database();
  const { rows } = await connection.pool.query<{ lab: string }>(
    "insert into labs (name, time_zone, created_at) values ('Quillfen', 'UTC', now()) returning id as lab",
  );
  const labId = rows[0]?.lab ?? '';
  const ids = [randomUUID(), randomUUID()];
  for (const [place, rigId] of ids.entries()) {
    await connection.pool.query('insert into rigs (lab_id, id, name, revision, created_at) values ($1, $2, $3, 1, now())', [
      labId,
      rigId,
      'North',
    ]);
    await takeRigLease(connection.db, { labId, rigId, holder: 'rig', leaseMs: place === 0 ? 60_000 : -1 });
  }
  expect(await (await opened('web')).driversIn(labId)).toEqual([{ rigId: ids[0], process: 'rig' }]);
});

test('a payload is shorter than 8000 bytes, and what is no message is left alone', () => {
  const pieces = toPieces('me', 7, { text: '€'.repeat(20_000) });
  expect(pieces.length).toBeGreaterThan(1);
  for (const piece of pieces) expect(Buffer.byteLength(piece)).toBeLessThan(8_000);
  const together = new Pieces();
  const found = [...pieces].reverse().map((piece) => together.add(piece, 'you'));
  expect(found.at(-1)).toEqual({ text: '€'.repeat(20_000) });
  for (const payload of ['', 'hello', 'a 1 0 1 {', ...pieces.map((piece) => piece.replace('me', 'you'))])
    expect(together.add(payload, 'you')).toBeNull();
});
