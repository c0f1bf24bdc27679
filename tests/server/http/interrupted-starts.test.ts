import { demoIds } from '@/db/demo/seed';
import type { Services } from '@/server/http/services';
import { heedSchedules } from '@/server/http/work/scheduled-starts';
import type { Mail } from '@/server/interfaces/mail';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol } from '@/tests/support/lab-server';

/** Scheduled starts whose server, or whose database, goes away in the middle. */

const database = databaseOfThisFile();
const mails: Mail[] = [];
let lab: LabServer;
let protocolId: string;
beforeAll(async () => {
  lab = await LabServer.start(database(), { overrides: { mail: { send: async (mail) => void mails.push(mail) } } });
  protocolId = await lab.issue(quickProtocol());
  await lab.arm();
}, 60_000);
afterAll(() => lab.stop());

const base = `/labs/${demoIds.lab}`;
const minute = 60_000;
const query = (text: string) => database().connection.pool.query(text);

/** Schedules one start for the next minute, in the time of the lab (Zurich in winter, UTC+1), and lets that minute come. */
async function due(): Promise<void> {
  const dueUtcMs = Math.ceil(lab.clock.utcMs() / minute) * minute + minute;
  const local = new Date(dueUtcMs + 60 * minute).toISOString();
  const plan = { kind: 'once', date: local.slice(0, 10), time: local.slice(11, 16) };
  const schedule = { rigId: demoIds.rig, protocolId, revision: 1, massSetId: demoIds.massSet, plan };
  await lab.as('operator', 'POST', `${base}/schedules`).send(schedule).expect(201);
  await lab.advance(dueUtcMs + 5_000 - lab.clock.utcMs());
  mails.length = 0;
}

async function newest(): Promise<{ state: string; why: string; runId: string | null }> {
  const [from, until] = [-24, 24].map((hours) => new Date(lab.clock.utcMs() + hours * 60 * minute).toISOString());
  const { body } = await lab.as('viewer', 'GET', `${base}/calendar?from=${String(from)}&until=${String(until)}`).expect(200);
  return body.items.at(-1);
}

const activeRuns = async () => (await lab.as('viewer', 'GET', `${base}/runs?active=true`).expect(200)).body.items as { id: string }[];
const missedAlarms = async () =>
  ((await lab.as('viewer', 'GET', `${base}/alarms`).expect(200)).body.items as { code: string; words: string }[]).filter(
    ({ code }) => code === 'missed-start',
  );

/** The services of a process whose transactions fare otherwise. */
function servicesWith(transaction: (work: () => Promise<unknown>) => Promise<unknown>): Services {
  const { services } = lab;
  const { database: connection } = services;
  const db = Object.create(connection.db) as typeof connection.db;
  Object.assign(db, { transaction: (work: never) => transaction(() => connection.db.transaction(work)) });
  return Object.assign(Object.create(services) as Services, { database: { ...connection, db } });
}

/** What a server does each minute, and time for the mails. */
async function heed(services: Services = lab.services): Promise<void> {
  await heedSchedules(services);
  await lab.advance(31_000);
}

test('a server that is killed after it took a start: the next one tells, a minute later, that it was missed, once', async () => {
  await due();
  // Its transactions never come to an end, and nothing comes after them.
  void heedSchedules(servicesWith(() => new Promise(() => undefined)));
  for (let turn = 0; turn < 200; turn += 1) {
    const { rows } = await query("select 1 from schedule_starts where outcome = 'taken'");
    if (rows.length > 0) break;
    await new Promise((resolve) => setTimeout(resolve, 10));
  }
  await heed();
  // It might still be at it.
  expect(await newest()).toMatchObject({ state: 'planned', runId: null });
  await lab.advance(minute);
  await heed();
  await heed();
  const why = 'The server was ended, or its database went away, while it was starting the run.';
  expect(await newest()).toMatchObject({ state: 'missed', why, runId: null });
  expect(mails).toMatchObject([{ subject: 'Not started: There and back on North bench', text: expect.stringContaining(why) }]);
  expect(await missedAlarms()).toMatchObject([{ words: `There and back: ${why}` }]);
  expect(await activeRuns()).toEqual([]);
});

test('a database that takes the run and whose answer is lost: the run is not begun, its rig is free again, and the start was missed', async () => {
  await due();
  const lost = servicesWith(async (work) => {
    await work();
    throw Object.assign(new Error('Connection terminated unexpectedly'), { code: 'ECONNRESET' });
  });
  await heed(lost);
  await lab.advance(minute);
  await heed();
  expect(await activeRuns()).toEqual([]);
  const item = await newest();
  expect(item).toMatchObject({ state: 'missed', runId: null, why: expect.stringContaining('was not begun') });
  expect(mails.filter(({ subject }) => subject.startsWith('Not started'))).toHaveLength(1);
  expect(lab.services.supervisor.takenBy(demoIds.rig)).toBeNull();
});

test('a start that cannot be told to be made is not made: nothing moves that is called missed', async () => {
  await query(`
    create function refuse_start() returns trigger language plpgsql as $$ begin raise exception 'no room'; end $$;
    create trigger refuse_start before update on schedule_starts for each row when (new.outcome = 'started') execute function refuse_start()`);
  await due();
  await heed();
  await query('drop trigger refuse_start on schedule_starts');
  expect(await activeRuns()).toEqual([]);
  expect(lab.services.supervisor.activeOf(demoIds.rig)).toBeNull();
  await lab.advance(minute);
  await heed();
  expect(await newest()).toMatchObject({ state: 'missed', runId: null });

  await due();
  await heed();
  const begun = await newest();
  expect(begun).toMatchObject({ state: 'started', why: '' });
  await lab.advance(2 * minute);
  await heed();
  expect(await newest()).toEqual(begun);
  await lab.until(begun.runId ?? '', 'finished');
});
