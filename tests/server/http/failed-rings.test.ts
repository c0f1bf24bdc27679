import { demoIds, demoPeople } from '@/db/demo/seed';
import type { AlarmHopView, AlarmView } from '@/shared/contracts/alarms';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol } from '@/tests/support/lab-server';
import { withoutDatabase } from '@/tests/support/without-database';
import { outsideWorld } from './outside-world';

/** A night in which messages do not go: the router of the lab restarts while somebody has to be woken. */

const database = databaseOfThisFile();
let lab: LabServer;
const outside = outsideWorld();
const { mails } = outside;

beforeAll(async () => {
  lab = await LabServer.start(database(), { overrides: { paceMs: 5_000, ...outside.overrides } });
  const idOf = (role: string) => demoPeople.find((one) => one.role === role)?.id ?? '';
  const order = [
    { userId: idOf('keeper'), near: true },
    { userId: idOf('analyst'), near: false },
  ];
  await lab.as('owner', 'PUT', path('/on-call')).send({ order, nextAfterMin: 10, starterFirst: false, morningAt: '21:45' }).expect(200);
}, 60_000);
afterAll(() => lab.stop());
beforeEach(() => {
  outside.mailWorks = true;
  mails.length = 0;
});

const path = (rest: string) => `/labs/${demoIds.lab}${rest}`;
const minutes = (count: number) => lab.advance(count * 60_000);
const to = () => mails.map((mail) => `${mail.to.split('@')[0] ?? ''}: ${mail.subject}`);
const alarmOf = async (code: string) =>
  ((await lab.as('viewer', 'GET', path('/alarms')).expect(200)).body.items as AlarmView[]).find(
    (alarm) => alarm.code === code,
  ) as AlarmView;
const hops = async (id: string) =>
  ((await lab.as('viewer', 'GET', path(`/alarms/${id}`)).expect(200)).body.hops as AlarmHopView[]).reverse();
const longDwell = quickProtocol({ steps: [{ kind: 'home' }, { kind: 'swing', to: 'near' }, { kind: 'dwell', for_s: 7200 }] });

test('mail that is away for some minutes delays the ring and silences nobody; in the morning it is told again', async () => {
  await lab.arm(1);
  outside.mailWorks = false;
  lab.world.controller(demoIds.rig).openInterlock();
  await lab.advance(30_000);
  const { id } = await alarmOf('interlock');
  expect((await hops(id)).map(({ name, means, outcome, detail }) => `${name} ${means} ${outcome} ${detail}`)).toEqual([
    'Casimir Thornquist push not-set-up no browser takes push messages for this person',
    'Casimir Thornquist mail failed 550 mailbox unavailable',
    'Tam Ferrowdale push not-set-up no browser takes push messages for this person',
    'Tam Ferrowdale mail failed 550 mailbox unavailable',
    'nobody none failed nothing reached Casimir Thornquist, Tam Ferrowdale: tried again in 1 min',
  ]);
  await minutes(2);
  outside.mailWorks = true;
  await minutes(2);
  expect(to()).toEqual(['casimir: Interlock or door opened: North bench']);
  await minutes(11);
  expect(to()).toEqual(['casimir: Interlock or door opened: North bench', 'tam: Interlock or door opened: North bench']);
  await minutes(11);
  expect((await hops(id)).at(-1)).toMatchObject({ detail: 'everybody on call was rung and nobody has acknowledged' });
  expect(mails).toHaveLength(2);
  // It was 21:00 in the lab, whose morning is at 21:45 here.
  await minutes(25);
  expect(to().slice(2)).toEqual(['casimir: Interlock or door opened: North bench', 'tam: Interlock or door opened: North bench']);
  expect(mails.at(-1)?.text).toContain('It still stands.');
  await lab.as('keeper', 'POST', path(`/alarms/${id}/acknowledge`)).expect(200);
  lab.world.controller(demoIds.rig).closeInterlock();
  await minutes(1);
}, 300_000);

test('a ring that failed while the database is away is tried again, until somebody was reached', async () => {
  await lab.run(longDwell);
  await lab.advance(45_000);
  mails.length = 0;
  await withoutDatabase(lab, async () => {
    outside.mailWorks = false;
    await minutes(2);
    outside.mailWorks = true;
    await minutes(2);
    expect(to()).toEqual(['casimir: Run held, database away: North bench']);
    await minutes(10);
    expect(to().at(-1)).toBe('tam: Run held, database away: North bench');
    await minutes(15);
    expect(mails).toHaveLength(2);
  });
}, 300_000);
