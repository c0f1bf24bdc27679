import { spawn, type ChildProcess } from 'node:child_process';
import { randomBytes, randomUUID } from 'node:crypto';
import { once } from 'node:events';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { createInterface } from 'node:readline';
import { demoIds, demoPeople, seedDemo } from '@/db/demo/seed';
import { createSessions } from '@/server/auth/sessions';
import { RealClock } from '@/server/boot/real-clock';
import type { LiveMessages } from '@/shared/contracts/runs';
import { cautionsVersion } from '@/shared/rig/cautions';
import { databaseOfThisFile } from '@/tests/support/database';
import { quickProtocol, sha256 } from '@/tests/support/lab-server';
import { LiveReader } from '@/tests/support/live-reader';

/** A lab as three processes that meet in the database alone. */
jest.setTimeout(90_000);

const root = join(__dirname, '../../..');
const folders: string[] = [];
const processes = new Map<string, ChildProcess>();
type Loose = ReturnType<JSON['parse']>;
let origin = '';
let cookie = '';

// Before the database is dropped.
afterAll(async () => {
  for (const child of processes.values()) {
    if (child.exitCode !== null || child.signalCode !== null) continue;
    const closed = once(child, 'close');
    child.kill('SIGTERM');
    await closed;
  }
  for (const folder of folders) rmSync(folder, { recursive: true });
});

const database = databaseOfThisFile();

async function begin(role: string): Promise<{ listening: string | null; roles: string[] }> {
  const state = mkdtempSync(join(tmpdir(), `evenfall-${role}-`));
  folders.push(state);
  const child = spawn(process.execPath, ['scripts/serve.mjs'], {
    cwd: root,
    env: {
      ...{ PATH: process.env.PATH ?? '', NODE_ENV: 'production', DATABASE_URL: database().url, PORT: '0', EVENFALL_LOG_LEVEL: 'fatal' },
      ...{ EVENFALL_ROLES: role, EVENFALL_STATE_DIR: state, EVENFALL_WEB_DIR: 'none', EVENFALL_VIRTUAL_EXIT_DELAY_S: '1' },
    } as unknown as NodeJS.ProcessEnv,
    stdio: ['ignore', 'pipe', 'inherit'],
  });
  processes.set(role, child);
  const [line] = (await once(createInterface({ input: child.stdout as NodeJS.ReadableStream }), 'line')) as [string];
  return JSON.parse(line) as { listening: string | null; roles: string[] };
}

beforeAll(async () => {
  const clock = new RealClock();
  const seed = { nowUtcMs: clock.utcMs(), hashPassword: async () => 'no password in this test', sha256, link: 'simulated' as const };
  await seedDemo(database().connection, seed);
  const newToken = () => randomBytes(32).toString('base64url');
  const sessions = createSessions({ db: database().connection.db, clock, newToken, sha256 });
  const operator = demoPeople.find(({ role }) => role === 'operator')?.id ?? '';
  cookie = `ef=${(await sessions.create(operator, { userAgent: 'test', ip: '127.0.0.1' })).token}`;
  const greetings = await Promise.all(['web', 'rig', 'worker'].map(begin));
  expect(greetings.map(({ listening, roles }) => [roles, listening === null])).toEqual([
    [['web'], false],
    [['rig'], true],
    [['worker'], true],
  ]);
  origin = greetings[0]?.listening ?? '';
});

/** While the process of the rigs lives, one that is starved is asked again with the same key, as a page does. */
async function ask(method: string, path: string, body?: object, headers: Record<string, string> = {}) {
  const key = randomUUID();
  for (let turn = 1; ; turn += 1) {
    const response = await fetch(`${origin}/api/labs/${demoIds.lab}${path}`, {
      method,
      headers: { cookie, origin, 'idempotency-key': key, 'content-type': 'application/json', ...headers },
      ...(body === undefined ? {} : { body: JSON.stringify(body) }),
    });
    const text = await response.text();
    const answer = {
      status: response.status,
      etag: response.headers.get('etag') ?? '',
      body: (text === '' ? null : JSON.parse(text)) as Loose,
    };
    if (answer.status !== 503 || turn === 5 || processes.get('rig')?.killed === true) return answer;
  }
}

/** Asks again until it is so: what another process does takes its time. */
async function until(path: string, holds: (body: Loose) => boolean): Promise<Loose> {
  for (let turn = 0; turn < 150; turn += 1) {
    const { body } = await ask('GET', path);
    if (holds(body)) return body;
    await new Promise((resolve) => setTimeout(resolve, 100));
  }
  throw new Error(`${path} never came to it: ${JSON.stringify((await ask('GET', path)).body).slice(0, 600)}`);
}

/** Resolves when a job that the process of the rigs asked for is done. */
async function workedOff(): Promise<void> {
  for (let turn = 0; turn < 150; turn += 1) {
    const { rows } = await database().connection.pool.query("select 1 from jobs where state = 'done'");
    if (rows.length > 0) return;
    await new Promise((resolve) => setTimeout(resolve, 100));
  }
  throw new Error('no job was done');
}

const rig = `/rigs/${demoIds.rig}`;
const now = () => new Date().toISOString();

test('a run is started, followed, held and stopped over web, and who started it is told by the worker; without the process of the rigs the web process says so', async () => {
  await until(rig, ({ live }) => live?.condition === 'ready');
  expect((await ask('GET', '/rigs')).body.items[0].live.condition).toBe('ready');
  const made = await ask('POST', '/protocols', { document: quickProtocol() });
  const protocolId = made.body.id as string;
  expect((await ask('POST', `/protocols/${protocolId}/revisions`, { rigId: demoIds.rig }, { 'if-match': made.etag })).status).toBe(201);

  expect((await ask('POST', `${rig}/cautions`, { version: cautionsVersion })).status).toBe(201);
  const refused = await ask('POST', `${rig}/virtual`, { armKey: 'sideways' });
  expect([refused.status, refused.body.code]).toEqual([400, 'invalid-input']);
  const arming = { name: 'Ilse Marrowby', until: new Date(Date.now() + 3_600_000).toISOString() };
  expect((await ask('POST', `${rig}/arm`, arming)).status).toBe(202);
  for (const armKey of ['off', 'on']) expect((await ask('POST', `${rig}/virtual`, { armKey })).status).toBe(204);
  await until(rig, ({ arm }) => arm?.name === 'Ilse Marrowby');

  const start = { protocolId, revision: 1, massSetId: demoIds.massSet };
  const late = { rigId: demoIds.rig, ...start, tappedAt: new Date(Date.now() - 6_000).toISOString(), reviewToken: 'x' };
  const tooLate = await ask('POST', '/runs', late);
  expect([tooLate.status, tooLate.body.code]).toEqual([409, 'not-possible-now']);
  const review = await ask('POST', `${rig}/start-review`, start);
  expect(review.status).toBe(201);
  const key = { 'idempotency-key': randomUUID() };
  const tapped = { rigId: demoIds.rig, ...start, tappedAt: now(), reviewToken: review.body.token };
  const run = await ask('POST', '/runs', tapped, key);
  expect(run.status).toBe(201);
  expect((await ask('POST', '/runs', tapped, key)).body.id).toBe(run.body.id);
  const path = `/runs/${run.body.id as string}`;

  const live = await LiveReader.open(`${origin}/api/labs/${demoIds.lab}${path}/live`, { cookie });
  const kinds = () => live.of('event').map(({ data }) => (data as { kind: string }).kind);
  const beats = () => live.of('beat').map(({ data }) => data as LiveMessages['beat']);
  await live.until(() => live.of('samples').length > 0 && beats().at(-1)?.link === 'ready');
  expect((await ask('POST', `${path}/hold`, {})).status).toBe(202);
  await live.until(() => kinds().includes('held'));
  expect((await ask('GET', path)).body).toMatchObject({ state: 'held', intervention: { kind: 'hold' } });
  expect((await ask('POST', `${path}/stop`, {})).status).toBe(202);
  await live.until(() => kinds().includes('stopped'));
  const seqs = live.of('event').map(({ id }) => id as number);
  expect(seqs).toEqual(seqs.map((_, place) => (seqs[0] ?? 0) + place));
  await workedOff();

  const rigs = processes.get('rig') as ChildProcess;
  rigs.kill('SIGKILL');
  await live.until(() => beats().at(-1)?.notDriven !== undefined);
  expect(beats().at(-1)?.link).toBe('lost');
  live.close();
  const held = await ask('POST', `${rig}/hold`, {});
  expect([held.status, held.body.code]).toEqual([503, 'rigs-away']);
  expect(held.body.detail).toContain('Use the switch at the rig');
  const known = await ask('GET', rig);
  expect(known.body.live).toMatchObject({ condition: 'closed', detail: 'no process drives the rig at the moment' });
  const armed = await ask('POST', `${rig}/arm`, arming);
  expect([armed.status, armed.body.code]).toEqual([503, 'rigs-away']);
  await until(path, ({ state }) => state === 'stopped');
  expect(await (await fetch(`${origin}/readyz`)).json()).toMatchObject({ ready: true, roles: ['web'], rigs: 'away', others: 'heard' });
});
