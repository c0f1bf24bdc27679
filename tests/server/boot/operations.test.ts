import { sql } from 'drizzle-orm';
import request from 'supertest';
import { demoIds } from '@/db/demo/seed';
import { createLog } from '@/server/boot/create-log';
import { insertBroker, tellBrokerStatus } from '@/server/store/brokers';
import { metricsText } from '@/server/http/metrics';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer } from '@/tests/support/lab-server';

/** What whoever runs a server looks at. */

const database = databaseOfThisFile();
let lab: LabServer;
let metricsAt: string;
beforeAll(async () => {
  lab = await LabServer.start(database(), { config: { metricsPort: 0 } });
  await lab.built.listen();
  metricsAt = `http://127.0.0.1:${String(lab.services.config.metricsPort)}/metrics`;
}, 60_000);
afterAll(() => lab.stop());

test('healthz says that the process lives, readyz that it can serve and drives its rigs', async () => {
  await request(lab.built.app).get('/healthz').expect(200, 'ok\n');
  const ready = await request(lab.built.app).get('/readyz').expect(200);
  expect(ready.body).toEqual({
    ...{ ready: true, roles: ['web', 'rig', 'worker'], database: 'answers', rigs: 'driving', others: 'none' },
  });
  const { pool } = lab.services.database;
  const query = pool.query.bind(pool);
  Object.assign(pool, { query: () => Promise.reject(new Error('gone')) });
  expect((await request(lab.built.app).get('/readyz').expect(503)).body).toMatchObject({ ready: false, database: 'away', rigs: 'unknown' });
  await request(lab.built.app).get('/healthz').expect(200);
  Object.assign(pool, { query });
});

test('figures for Prometheus, on loopback alone and not beside the application', async () => {
  await lab.as('viewer', 'GET', '/health').expect(200);
  const { db } = lab.services.database;
  const place = {
    labId: demoIds.lab,
    rigId: demoIds.rig,
    address: 'mqtt://sensors.lan',
    userName: null,
    password: null,
    ca: null,
    topics: [],
  };
  const broker = await insertBroker(db, { ...place, madeAt: lab.clock.utcMs(), madeBy: 'Ott' });
  const heard = { taken: 7, refused: 2, last: null, lastRefused: null };
  await tellBrokerStatus(db, broker, { state: 'away', since: lab.nowIso(), reason: null, toldAt: lab.nowIso(), topics: [heard, heard] });
  const response = await fetch(metricsAt);
  expect(response.headers.get('content-type')).toBe('text/plain; version=0.0.4');
  const text = await response.text();
  expect(text).toMatch(/^evenfall_database_up 1$/m);
  expect(text).toMatch(/^evenfall_rig_link_ready\{rig="[0-9a-f-]{36}",name="North bench"\} 1$/m);
  expect(text).toMatch(/^evenfall_broker_up\{rig="[0-9a-f-]{36}",address="mqtt:\/\/sensors\.lan"\} 0$/m);
  expect(text).toMatch(/^evenfall_broker_taken\{.*\} 14$/m);
  expect(text).toMatch(/^evenfall_broker_refused\{.*\} 4$/m);
  expect(text).toMatch(/^evenfall_http_answer_seconds_count\{method="GET",status="2xx"\} [1-9]/m);
  // The form of the lines, after the exposition format 0.0.4.
  for (const line of text.trim().split('\n'))
    expect(line).toMatch(/^(# (HELP|TYPE) [a-z_0-9]+ .+|[a-z_0-9]+(\{[a-z]+="[^"]*"(,[a-z]+="[^"]*")*\})? -?[0-9.e+-]+)$/);
  expect((await fetch(metricsAt.replace('/metrics', '/'))).status).toBe(404);
  await lab.as('owner', 'GET', '/metrics').expect(404);
});

test('a label may hold quotes and line ends', () => {
  const metrics = metricsText([{ name: 'a', type: 'gauge', help: 'h', samples: [{ labels: { name: 'the "north"\\\nbench' }, value: 1 }] }]);
  expect(metrics).toBe('# HELP a h\n# TYPE a gauge\na{name="the \\"north\\"\\\\\\nbench"} 1\n');
});

test('logs name nobody and let nobody in, also where a query fails', async () => {
  const lines: string[] = [];
  const log = createLog({ mode: 'production', logLevel: 'info' }, { write: (line) => void lines.push(line) });
  const secret = 'ilse@quillfen.example';
  log.info({ email: secret, deep: { er: { token: secret, subscription: { endpoint: secret, auth: secret } } } }, 'sent');
  const failure = await database()
    .connection.db.execute(sql`select ${secret}::int`)
    .catch((error: unknown) => error);
  log.error({ err: failure }, 'a query failed');
  expect(lines.map((line) => (JSON.parse(line) as { msg: string }).msg)).toEqual(['sent', 'a query failed']);
  expect(lines[0]).not.toContain(secret);
  expect(lines[1]).toContain('Failed query: select');
  expect(lines[1]).toContain('invalid input syntax for type integer');
  expect(lines[1]).not.toContain(secret);
});
