import { spawn, type ChildProcess } from 'node:child_process';
import { once } from 'node:events';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { createInterface } from 'node:readline';
import { databaseOfThisFile } from '@/tests/support/database';

/** The server as its own process, as the start script starts it. */
jest.setTimeout(120_000);

const database = databaseOfThisFile();
const root = join(__dirname, '../../..');
const state = mkdtempSync(join(tmpdir(), 'evenfall-state-'));
afterAll(() => rmSync(state, { recursive: true }));

function start(environment: Record<string, string>): { child: ChildProcess; said: Promise<string>; complaints: () => string } {
  const child = spawn(process.execPath, ['scripts/serve.mjs'], {
    cwd: root,
    env: { PATH: process.env.PATH ?? '', ...environment } as unknown as NodeJS.ProcessEnv,
    stdio: ['ignore', 'pipe', 'pipe'],
  });
  let complaints = '';
  child.stderr?.on('data', (chunk: Buffer) => {
    complaints += chunk.toString();
  });
  const lines = createInterface({ input: child.stdout as NodeJS.ReadableStream });
  return { child, said: once(lines, 'line').then(([line]) => String(line)), complaints: () => complaints };
}

test('an environment that is not right ends it with code 2 and says what is', async () => {
  const { child, complaints } = start({ DATABASE_URL: 'mysql://here', PORT: 'many' });
  const [code] = (await once(child, 'close')) as [number];
  expect(code).toBe(2);
  expect(complaints()).toContain('DATABASE_URL: must begin with postgres://');
  expect(complaints()).toContain('PORT: ');
});

test.each(['SIGTERM', 'SIGINT'] as const)('migrates, seeds, says where it listens, answers, and ends cleanly on %s', async (signal) => {
  const { child, said, complaints } = start({
    NODE_ENV: 'production',
    DATABASE_URL: database().url,
    PORT: '0',
    EVENFALL_DEMO: '1',
    EVENFALL_STATE_DIR: state,
    EVENFALL_WEB_DIR: 'none',
  });
  const greeting = JSON.parse(await said) as {
    listening: string;
    signIns: { email: string; role: string; password: string }[];
    mailbox: string;
  };
  expect(greeting.listening).toMatch(/^http:\/\/127\.0\.0\.1:\d+$/);
  expect(greeting.signIns.map(({ role }) => role)).toEqual(['owner', 'keeper', 'operator', 'analyst', 'viewer']);
  expect(greeting.mailbox).toBe(join(state, 'mail'));

  const { email, password } = greeting.signIns[0] ?? { email: '', password: '' };
  const signedIn = await fetch(`${greeting.listening}/api/session`, {
    method: 'POST',
    headers: { 'content-type': 'application/json', origin: greeting.listening },
    body: JSON.stringify({ email, password }),
  });
  expect(signedIn.status).toBe(200);
  expect(signedIn.headers.get('set-cookie')).toMatch(/^ef=[\w-]{43}; Path=\/; Expires=.*; HttpOnly; SameSite=Lax$/);
  const lab = ((await signedIn.json()) as { memberships: { labId: string }[] }).memberships[0]?.labId;
  const rigs = await fetch(`${greeting.listening}/api/labs/${String(lab)}/rigs`, {
    headers: { cookie: signedIn.headers.get('set-cookie')?.split(';')[0] ?? '' },
  });
  expect(rigs.status).toBe(200);

  child.kill(signal);
  const [code] = (await once(child, 'close')) as [number];
  const serious = complaints()
    .split('\n')
    .filter((line) => /"level":(40|50|60)/.test(line));
  expect({ code, serious }).toEqual({ code: 0, serious: [] });
});
