import { randomBytes, randomUUID } from 'node:crypto';
import { mkdtempSync, readdirSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { Express } from 'express';
import { simpleParser } from 'mailparser';
import { pino } from 'pino';
import request from 'supertest';
import { hashPassword } from '@/server/auth/passwords';
import { createSessions } from '@/server/auth/sessions';
import { VirtualClock } from '@/server/engine/virtual-clock';
import { AccessDirectory } from '@/server/http/access-directory';
import { createApp } from '@/server/http/create-app';
import { auditRoutes } from '@/server/http/routes/audit';
import { peopleRoutes } from '@/server/http/routes/people';
import { AnswerCounts } from '@/server/http/metrics';
import type { Services } from '@/server/http/services';
import type { ServerConfig } from '@/server/interfaces/server-config';
import { startDemoMailbox } from '@/server/notify/demo-mailbox';
import { mailJobs } from '@/server/notify/mail-jobs';
import { createSmtpMail } from '@/server/notify/smtp-mail';
import type { Connection } from '@/server/store/database';
import { createIdempotency } from '@/server/store/idempotency';
import { createJobQueue } from '@/server/store/jobs';
import { accessSource, addMember, createUser } from '@/server/store/people';
import { createSampleStore } from '@/server/store/sample-store';
import type { Role } from '@/shared/contracts/roles';
import { eveningUtcMs, sha256 } from '../store/rows';

export const password = 'lantern moss quartz';
let passwordHash: Promise<string> | undefined;

export interface PeopleApp {
  app: Express;
  clock: VirtualClock;
  services: Services;
  /** Sends what was asked for; the mails of this call as people get them. */
  mails(): Promise<{ to: string; subject: string; text: string }[]>;
  close(): Promise<void>;
}

/** The routes of people on a real database, with real SMTP into a folder and a clock that moves when told. */
export async function peopleApp(connection: Connection, changes: Partial<ServerConfig> = {}): Promise<PeopleApp> {
  const clock = new VirtualClock(eveningUtcMs, () => Promise.resolve());
  const nowUtcMs = () => clock.utcMs();
  const folder = mkdtempSync(join(tmpdir(), 'evenfall-mail-'));
  const mailbox = await startDemoMailbox({ folder, clock });
  const mail = createSmtpMail({ url: mailbox.url, from: 'Evenfall <evenfall@quillfen.example>' });
  const newToken = () => randomBytes(32).toString('base64url');
  const sessions = createSessions({ db: connection.db, clock, newToken, sha256 });
  // The routes of people touch no rig: what drives rigs and streams is left out.
  const services = {
    config: testConfig(folder, changes),
    clock,
    log: pino({ level: 'silent' }),
    newId: randomUUID,
    answers: new AnswerCounts(),
    newToken,
    sha256,
    database: connection,
    databaseAwaySinceUtcMs: () => null,
    sessions,
    access: new AccessDirectory({ source: accessSource(connection.db, nowUtcMs), sessions, clock, sha256 }),
    idempotency: createIdempotency(connection.db, nowUtcMs),
    mail,
    samples: createSampleStore(connection),
    breathe: () => Promise.resolve(),
    pokeJobs: () => undefined,
  } satisfies Partial<Services> as unknown as Services;
  const queue = createJobQueue(connection.db, 'test', nowUtcMs);
  const handlers = mailJobs({ db: connection.db, clock, mail, newToken, sha256 });
  let read = 0;
  return {
    app: createApp(services, [...peopleRoutes, ...auditRoutes]),
    clock,
    services,
    mails: async () => {
      for (let job = await queue.take(Object.keys(handlers)); job !== null; job = await queue.take(Object.keys(handlers))) {
        await handlers[job.kind]?.(job);
        await queue.finish(job);
      }
      const fresh = readdirSync(folder).sort().slice(read);
      read += fresh.length;
      return Promise.all(fresh.map(async (name) => mailIn(readFileSync(join(folder, name)))));
    },
    close: async () => {
      mail.close();
      await mailbox.close();
      rmSync(folder, { recursive: true });
    },
  };
}

async function mailIn(bytes: Buffer) {
  const parsed = await simpleParser(bytes);
  const to = Array.isArray(parsed.to) ? parsed.to[0] : parsed.to;
  return { to: to?.text ?? '', subject: parsed.subject ?? '', text: parsed.text ?? '' };
}

const testConfig = (stateDir: string, changes: Partial<ServerConfig>): ServerConfig => ({
  mode: 'test',
  roles: ['web', 'rig', 'worker'],
  databaseUrl: '',
  host: '127.0.0.1',
  port: 4460,
  publicUrl: null,
  trustedProxies: 0,
  demo: false,
  virtualExitDelayS: 120,
  watchdogS: 3,
  secretKey: null,
  stateDir,
  webDir: null,
  ...{ filesDir: stateDir, s3: null, databaseDir: null },
  smtpUrl: null,
  mailFrom: 'Evenfall <evenfall@quillfen.example>',
  privateHosts: [],
  cameraHosts: [],
  metricsPort: null,
  logLevel: 'silent',
  limits: { requestsPerMinute: 100_000, interventionsPerMinute: 1000, jsonBytes: 100_000, importBytes: 100_000, streamsPerUser: 6 },
  devices: { batchBytes: 1000, batchesPerMinute: 10, samplesPerMinute: 100 },
  ...changes,
});

/** A member with the password of all these tests. */
export async function member(connection: Connection, labId: string, who: { role: Role; name?: string; demo?: boolean }) {
  passwordHash ??= hashPassword(password);
  const email = `${who.role}.${randomUUID().slice(0, 8)}@quillfen.example`;
  const user = await createUser(connection.db, {
    name: who.name ?? `Some ${who.role}`,
    email,
    passwordHash: await passwordHash,
    demo: who.demo ?? false,
    nowUtcMs: eveningUtcMs,
  });
  if (user === null) throw new Error('the address is taken');
  await addMember(connection.db, { labId, userId: user.id, role: who.role, nowUtcMs: eveningUtcMs });
  return user;
}

const sameOrigin = { 'Sec-Fetch-Site': 'same-origin' };

/** A browser: keeps its cookie, says where it comes from, gives each command a key. */
export class Caller {
  private readonly agent;

  constructor(app: Express) {
    this.agent = request.agent(app);
  }

  get = (path: string) => this.agent.get(`/api${path}`);
  post = (path: string, body: object = {}) =>
    this.agent.post(`/api${path}`).set(sameOrigin).set('Idempotency-Key', randomUUID()).send(body);
  patch = (path: string, body: object) => this.agent.patch(`/api${path}`).set(sameOrigin).send(body);
  delete = (path: string) => this.agent.delete(`/api${path}`).set(sameOrigin);
  signIn = (email: string, given = password) => this.post('/session', { email, password: given });
}

/** Signed in as `email`. */
export async function caller(app: Express, email: string): Promise<Caller> {
  const browser = new Caller(app);
  await browser.signIn(email).expect(200);
  return browser;
}

/** The token at the end of the only link in a mail. */
export function tokenIn(text: string): string {
  const links = text.match(/https?:\/\/\S+/g) ?? [];
  if (links.length !== 1) throw new Error(`a mail has one link, this one has ${links.length}`);
  return (links[0] as string).split(/[/=]/).at(-1) as string;
}
