import { demoIds } from '@/db/demo/seed';
import { sendSigns } from '@/server/http/work/signs-of-life';
import type { AlarmView } from '@/shared/contracts/alarms';
import type { WatcherView } from '@/shared/contracts/calls';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol } from '@/tests/support/lab-server';
import { outsideWorld } from './outside-world';

/** A lab as two processes on one database: one drives the rigs and answers pages, the other does the jobs and tells the outside watcher that all is well. */

const database = databaseOfThisFile();
const outside = outsideWorld();
const { mails, watcher } = outside;
let rigs: LabServer;
let worker: LabServer;
const path = (rest: string) => `/labs/${demoIds.lab}${rest}`;

const beginRigs = () => LabServer.start(database(), { config: { roles: ['web', 'rig'] }, overrides: outside.overrides });
beforeAll(async () => {
  rigs = await beginRigs();
  worker = await LabServer.start(database(), { config: { roles: ['worker'] }, overrides: outside.overrides });
  const { body } = await rigs.as('owner', 'PUT', path('/watcher')).send({ url: 'https://watch.example/ping' }).expect(200);
  expect(body.ok).toBe(true);
}, 60_000);
afterAll(async () => {
  await worker.stop();
  await rigs.stop();
});

/** What the worker does each minute, and the jobs that come of it. Returns how often the watcher heard of it, and who was told what. */
async function minute(): Promise<{ signs: number; told: string[] }> {
  watcher.asked.length = mails.length = 0;
  await sendSigns(worker.services);
  await worker.advance(11_000);
  return { signs: watcher.asked.length, told: mails.map(({ to, subject }) => `${to.split('@')[0] ?? ''}: ${subject}`) };
}

/** The process of the rigs is killed: its leases run out by the clock of PostgreSQL and are not renewed. */
async function left(forS: number): Promise<void> {
  const until = `clock_timestamp() - interval '${forS} seconds'`;
  await database().connection.pool.query(`update rig_leases set until_at = ${until}`);
}

const alarm = async () =>
  ((await worker.as('viewer', 'GET', path('/alarms')).expect(200)).body.items as AlarmView[]).find(({ code }) => code === 'not-driven');
/** The other process is there again and renews its leases. */
const back = () => rigs.advance(31_000);

test('a rig that nobody counts on may be left alone', async () => {
  await left(3_600);
  expect(await minute()).toEqual({ signs: 1, told: [] });
  expect(await alarm()).toBeUndefined();
  await back();
});

test('an armed rig that nobody drives: after a minute the watcher hears nothing and those on call are rung; both end when it is driven again', async () => {
  await rigs.arm();
  // As long as it takes another process to take over, or the same one to be started again.
  await left(50);
  expect(await minute()).toEqual({ signs: 1, told: [] });
  await left(61);
  expect(await minute()).toEqual({ signs: 0, told: [expect.stringMatching(/: Nobody drives the rig: North bench$/)] });
  expect(await alarm()).toMatchObject({
    state: 'active-unacknowledged',
    words: 'No server has driven the rig for over a minute. It is armed.',
  });
  const { body } = await worker.as('owner', 'GET', path('/watcher')).expect(200);
  expect(body as WatcherView).toMatchObject({ ok: false, detail: 'not sent: nobody drives North bench' });
  // It is told once, and the watcher goes on hearing nothing.
  expect((await minute()).signs).toBe(0);
  expect(await alarm()).toMatchObject({ occurrence: 1 });
  await back();
  expect((await minute()).signs).toBe(1);
  expect(await alarm()).toMatchObject({ state: 'returned-unacknowledged' });
});

test('a run that has not ended, and a start within two hours, count on their rig; one that is later does not', async () => {
  await rigs.as('operator', 'DELETE', path(`/rigs/${demoIds.rig}/arm`)).expect(204);
  const protocolId = await rigs.issue(quickProtocol({ onInterruption: 'hold' }));
  // In the time of the lab: Zurich in winter, UTC+1.
  const dueUtcMs = Math.ceil(worker.clock.utcMs() / 60_000) * 60_000 + 125 * 60_000;
  const local = new Date(dueUtcMs + 3_600_000).toISOString();
  const plan = { kind: 'once', date: local.slice(0, 10), time: local.slice(11, 16) };
  const made = await rigs
    .as('operator', 'POST', path('/schedules'))
    .send({ rigId: demoIds.rig, protocolId, revision: 1, massSetId: demoIds.massSet, plan })
    .expect(201);
  await left(3_600);
  expect((await minute()).signs).toBe(1);
  await worker.advance(6 * 60_000);
  expect((await minute()).signs).toBe(0);
  expect((await alarm())?.words).toContain(`"There and back" is to start ${local.slice(0, 10)} ${local.slice(11, 16)}`);
  await rigs
    .as('operator', 'PATCH', path(`/schedules/${made.body.id as string}`))
    .send({ state: 'ended' })
    .expect(200);
  expect((await minute()).signs).toBe(1);

  await back();
  const runId = await rigs.run(quickProtocol({ onInterruption: 'hold' }));
  await rigs.advance(60_000);
  await left(61);
  expect((await minute()).signs).toBe(0);
  expect(await alarm()).toMatchObject({ runId, words: 'No server has driven the rig for over a minute. A run of it has not ended.' });
  await back();
  expect((await minute()).signs).toBe(1);
  await rigs.until(runId, 'finished', 'held');
});

test('a server that is started again takes its rig back before anybody is told', async () => {
  await rigs.arm();
  await rigs.stop();
  expect(await minute()).toEqual({ signs: 1, told: [] });
  rigs = await beginRigs();
  expect((await minute()).signs).toBe(1);
});
