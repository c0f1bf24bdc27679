import { demoIds, demoPeople } from '@/db/demo/seed';
import type { ChainedEvent } from '@/shared/archive/run-records';
import type { Role } from '@/shared/contracts/roles';
import { liveMessageSchemas, type RunView } from '@/shared/contracts/runs';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol } from '@/tests/support/lab-server';
import { LiveReader } from '@/tests/support/live-reader';

jest.setTimeout(60_000);

const database = databaseOfThisFile();
let lab: LabServer;
let address: string;
const open: LiveReader[] = [];

beforeAll(async () => {
  lab = await LabServer.start(database());
  address = await lab.built.listen();
}, 60_000);
afterAll(() => lab.stop());
afterEach(async () => {
  for (const reader of open.splice(0)) reader.close();
  const driver = lab.services.supervisor.activeOf(demoIds.rig);
  if (driver === null) return;
  await lab.intervene(driver.runId, 'stop');
  await lab.advance(60_000, () => driver.isOver());
});

async function follow(runId: string, headers: Record<string, string> = {}, who: 'viewer' | 'owner' = 'viewer'): Promise<LiveReader> {
  const reader = await LiveReader.open(`${address}/api/labs/${demoIds.lab}/runs/${runId}/live`, {
    cookie: lab.cookie(who),
    'accept-encoding': 'gzip',
    ...headers,
  });
  open.push(reader);
  return reader;
}

const seqsOf = (reader: LiveReader) => reader.of('event').map(({ id }) => id);
const range = (from: number, to: number) => Array.from({ length: Math.max(0, to - from + 1) }, (_, index) => from + index);
/** The run as a page that reads this stream shows it: the snapshot, moved on by all progress. */
const viewOf = (reader: LiveReader) =>
  Object.assign({}, ...[...reader.of('snapshot'), ...reader.of('progress')].map(({ data }) => data)) as Partial<RunView>;

test('begins with the whole, as an uncompressed stream that says how to come back', async () => {
  const runId = await lab.run(quickProtocol());
  const reader = await follow(runId);
  await reader.until(({ events }) => events.length > 0);
  expect(reader.response.headers).toMatchObject({
    'content-type': 'text/event-stream; charset=utf-8',
    'cache-control': 'no-store',
    'x-accel-buffering': 'no',
  });
  expect(reader.response.headers['content-encoding']).toBeUndefined();
  expect(reader.retryMs).toBe(2000);
  const [first] = reader.events;
  const view = liveMessageSchemas.snapshot.parse(first?.data);
  expect(first).toMatchObject({ event: 'snapshot', id: view.lastSeq });
});

test('tells each event once with its number, the rows, the samples and a beat each second', async () => {
  const runId = await lab.run(quickProtocol());
  const reader = await follow(runId);
  await reader.until(({ events }) => events.length > 0);
  const from = (reader.of('snapshot')[0]?.data as RunView).lastSeq;
  await lab.until(runId, 'finished');
  await reader.until(() => viewOf(reader).state === 'finished');
  expect(seqsOf(reader)).toEqual(range(from + 1, Number(viewOf(reader).lastSeq)));
  const rows = new Map(
    reader
      .of('step')
      .map(({ data }) => liveMessageSchemas.step.parse(data))
      .map((row) => [row.seq, row]),
  );
  expect([...rows.values()].map(({ path, outcome }) => [path, outcome])).toEqual([
    ['1.home', 'done'],
    ['2.swing', 'done'],
    ['3.dwell', 'done'],
    ['4.swing', 'done'],
    ['5.dwell', 'done'],
  ]);

  const beats = reader.of('beat').map(({ data }) => liveMessageSchemas.beat.parse(data));
  // The first comes with the snapshot, the others on the second.
  const times = beats.slice(1).map(({ serverAt }) => Date.parse(serverAt));
  expect(times.slice(1).every((at, index) => at - (times[index] as number) === 1000)).toBe(true);
  expect(beats.at(-1)).toMatchObject({ link: 'ready', angleDeg: expect.any(Number) });
  const samples = reader.of('samples').map(({ data }) => liveMessageSchemas.samples.parse(data));
  expect(samples.every(({ channel, unit }) => channel === 'deflection' && unit === 'rad')).toBe(true);
  const instants = samples.flatMap(({ utcMs }) => utcMs);
  expect(instants.every((at, index) => index === 0 || Math.abs(at - (instants[index - 1] as number) - 100) < 0.01)).toBe(true);
  expect(reader.comments).toBeGreaterThan(2);
});

test('what a page puts together from one snapshot and the progress after it is what the run is; rig and protocol are sent once', async () => {
  const runId = await lab.run(quickProtocol());
  const reader = await follow(runId);
  await reader.until(({ events }) => events.length > 0);
  await lab.until(runId, 'finished');
  await reader.until(() => viewOf(reader).state === 'finished');
  expect(viewOf(reader)).toEqual(await lab.view(runId));
  expect(reader.of('snapshot')).toHaveLength(1);
  const progress = reader.of('progress').map(({ data }) => liveMessageSchemas.progress.parse(data));
  expect(progress.length).toBeGreaterThan(10);
});

test('comes back after Last-Event-ID without losing or repeating anything, however often the line breaks', async () => {
  const runId = await lab.run(quickProtocol());
  const seen: number[] = [];
  const states: string[] = [];
  let lastId: number | null = null;
  let done = false;
  while (!done) {
    const reader = await follow(runId, lastId === null ? {} : { 'last-event-id': String(lastId) });
    await reader.until(({ events }) => events.some(({ event }) => event === 'snapshot'));
    const begun = liveMessageSchemas.snapshot.parse(reader.of('snapshot')[0]?.data).lastSeq;
    if (lastId === null) seen.push(...range(1, begun));
    const before: number = lastId ?? begun;
    await lab.advance(7_000);
    const now = (await lab.view(runId)).lastSeq;
    await reader.until(() => (reader.lastId() ?? 0) >= now);
    seen.push(...seqsOf(reader).map(Number));
    expect(seqsOf(reader)).toEqual(range(before + 1, now));
    states.push(String(viewOf(reader).state));
    lastId = reader.lastId();
    done = viewOf(reader).state === 'finished';
    reader.close();
    // While nobody listens the run goes on.
    await lab.advance(7_000);
  }
  const all = (await lab.as('viewer', 'GET', `/labs/${demoIds.lab}/runs/${runId}/events?limit=500`)).body.items as ChainedEvent[];
  expect(seen).toEqual(all.map(({ seq }) => seq));
  expect(states.at(-1)).toBe('finished');
});

test('comes back with the rows of the steps that ended meanwhile', async () => {
  const runId = await lab.run(quickProtocol());
  const reader = await follow(runId);
  await reader.until(({ events }) => events.length > 0);
  const lastId = reader.lastId();
  reader.close();
  await lab.until(runId, 'finished');
  const again = await follow(runId, { 'last-event-id': String(lastId) });
  await again.until(() => viewOf(again).state === 'finished');
  expect(
    again
      .of('step')
      .map(({ data }) => liveMessageSchemas.step.parse(data))
      .map(({ path, outcome }) => `${path} ${String(outcome)}`),
  ).toEqual(['1.home done', '2.swing done', '3.dwell done', '4.swing done', '5.dwell done']);
});

test('a number that is not of this run is answered with the whole', async () => {
  const runId = await lab.run(quickProtocol());
  for (const id of ['99999', 'nonsense', '-1']) {
    const reader = await follow(runId, { 'last-event-id': id });
    await reader.until(({ events }) => events.length > 0);
    expect(reader.events[0]?.event).toBe('snapshot');
    // The run goes on meanwhile: what comes after the whole is what happened after it.
    const { lastSeq } = liveMessageSchemas.snapshot.parse(reader.events[0]?.data);
    expect(seqsOf(reader)).toEqual(range(lastSeq + 1, lastSeq + seqsOf(reader).length));
    reader.close();
  }
});

test('ends with the session, and with the membership', async () => {
  const runId = await lab.run(quickProtocol());
  const mine = await follow(runId);
  const others = await follow(runId, {}, 'owner');
  await Promise.all([mine, others].map((reader) => reader.until(({ events }) => events.length > 0)));
  await lab.as('viewer', 'DELETE', '/session').expect(204);
  await mine.untilEnded();
  expect(others.ended).toBe(false);
  expect((await follow(runId)).response.statusCode).toBe(401);
  await lab.signIn(demoPeople.find(({ role }) => role === 'viewer')?.id ?? '');

  const again = await follow(runId);
  await again.until(({ events }) => events.length > 0);
  // Taken away behind the server's back, as another process would: seen within half a minute.
  await database().connection.pool.query("delete from memberships where role = 'viewer'");
  await lab.advance(31_000);
  await again.untilEnded();
  await database().connection.pool.query(
    `insert into memberships (lab_id, user_id, role, since) values ('${demoIds.lab}', '${demoPeople.find(({ role }) => role === 'viewer')?.id ?? ''}', 'viewer', now())`,
  );
});

test('six at a time and person; the seventh is told why', async () => {
  const runId = await lab.run(quickProtocol());
  for (let count = 0; count < 6; count += 1) await follow(runId);
  const seventh = await follow(runId);
  expect(seventh.response.statusCode).toBe(429);
  expect((await follow(runId, {}, 'owner')).response.statusCode).toBe(200);
  open[0]?.close();
  await open[0]?.untilEnded();
  for (let turn = 0; turn < 20; turn += 1) await new Promise((resolve) => void setImmediate(resolve));
  expect((await follow(runId)).response.statusCode).toBe(200);
});

const runs = `/labs/${demoIds.lab}/runs`;

test('a page has what it needs when the database is away: who asks, what runs and how it stands, but not its log', async () => {
  const runId = await lab.run(quickProtocol());
  await lab.advance(3_600_000, () => lab.services.supervisor.driverOf(runId)?.facts().current?.kind === 'dwell');
  const { pool } = lab.services.database;
  const working = { connect: pool.connect.bind(pool), query: pool.query.bind(pool) };
  const away = () => Promise.reject(Object.assign(new Error('connect ECONNREFUSED 127.0.0.1'), { code: 'ECONNREFUSED' }));
  const ask = (who: Role, path: string) => lab.as(who, 'GET', path);
  Object.assign(pool, { connect: away, query: away });
  const [session, active, run, steps, foreign, stranger] = await Promise.all([
    ask('viewer', '/session'),
    ask('viewer', `${runs}?active=true&limit=20`),
    ask('viewer', `${runs}/${runId}`),
    ask('viewer', `${runs}/${runId}/steps`),
    ask('viewer', `/labs/${demoIds.rig}/runs?active=true`),
    ask('viewer', '/session').set('Cookie', 'ef=made-up'),
  ]).finally(() => Object.assign(pool, working));
  expect(session.body.memberships).toEqual([expect.objectContaining({ labId: demoIds.lab, role: 'viewer' })]);
  expect(active.body.items).toMatchObject([{ id: runId, state: 'running' }]);
  expect(run.body).toMatchObject({ id: runId, current: { kind: 'dwell' } });
  expect(steps.body.code).toBe('database-away');
  // Nobody is let in who was not known before, and nobody sees another lab.
  expect([foreign.status, stranger.status]).toEqual([503, 401]);
  await lab.intervene(runId, 'stop').expect(202);
  await lab.until(runId, 'stopped');
});
