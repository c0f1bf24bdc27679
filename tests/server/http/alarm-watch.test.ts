import { alarms, jobs } from '@/db/schema';
import { demoIds, seedDemo } from '@/db/demo/seed';
import { VirtualClock } from '@/server/engine/virtual-clock';
import type { Services } from '@/server/http/services';
import { AlarmWatch } from '@/server/http/work/alarm-watch';
import { insertCamera, removeCamera, tellCameraStatus } from '@/server/store/cameras';
import { insertBroker, removeBroker, tellBrokerStatus } from '@/server/store/brokers';
import { addLimit } from '@/server/store/channel-limits';
import { createSampleStore } from '@/server/store/sample-store';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { databaseOfThisFile } from '@/tests/support/database';
import { sha256 } from '@/tests/support/lab-server';

/** What the watch makes of what it finds, on a real database; the rig and its run are as the test says. */

const database = databaseOfThisFile();
const clock = new VirtualClock(Date.UTC(2031, 1, 14, 23), () => Promise.resolve());
const runId = '00000000-0000-4000-8000-00000000aaaa';
const periodMs = 1000 * (demoRigWide.measured?.period_s?.value ?? NaN);
let free: number | null = null;
let run: { state: string; reasonCode: string; reason: string } | null = null;

const link = { health: () => ({ condition: 'ready', detail: '' }), controller: () => ({}) };
const station = {
  ...{ labId: demoIds.lab, rigId: demoIds.rig, link },
  channel: { id: demoIds.channel, name: 'deflection', unit: 'rad' },
};
const facts = () => ({
  ...{
    runId,
    startedAtUtcMs: Date.UTC(2031, 1, 14, 20),
    predictedEndUtcMs: null,
    plannedEndUtcMs: Date.UTC(2031, 1, 15, 4),
    finishing: null,
    loud: null,
  },
  ...{ dwellsDone: 0, dwellsGood: 0, dwellsUnpaired: 0, dwellsPlanned: 32 },
  ...run,
});
const driver = { isOver: () => false, facts, parts: { start: { rig: demoRigWide } } };

function watchOf(): AlarmWatch {
  const { connection } = database();
  const services = {
    ...{ clock, database: connection },
    stations: { get: (rigId: string) => (rigId === demoIds.rig ? station : null) },
    supervisor: { activeOf: () => (run === null ? null : driver), quarantinedOf: () => null },
    locks: { lockedBy: () => null },
    activeRuns: { find: () => undefined, all: () => [] },
  };
  return new AlarmWatch({
    services: services as unknown as Services,
    freeDisk: async () => (free === null ? null : { disk: 'the disk of the database', free }),
  });
}

/** So many that the database is looked into once more. */
async function looks(watch: AlarmWatch): Promise<void> {
  for (let look = 0; look < 6; look += 1) await watch.look();
}
const alarmOf = async (code: string) => (await database().connection.db.select().from(alarms)).find((alarm) => alarm.code === code);
const store = (utcMs: number[], value: (utcMs: number) => number) =>
  createSampleStore(database().connection).append(demoIds.lab, demoIds.channel, {
    utcMs: Float64Array.from(utcMs),
    value: Float64Array.from(utcMs.map(value)),
  });

beforeAll(async () => {
  const hashPassword = () => Promise.resolve('no password in this test');
  await seedDemo(database().connection, { nowUtcMs: clock.utcMs(), hashPassword, sha256, link: 'simulated' });
}, 60_000);

test('a disk that is nearly full is told after a minute, and is over when there is room again', async () => {
  const watch = watchOf();
  await looks(watch);
  expect(await alarmOf('disk-low')).toBeUndefined();
  free = 0.04;
  await looks(watch);
  expect(await alarmOf('disk-low')).toMatchObject({ state: 'normal', rigId: null });
  await clock.advance(61_000);
  await looks(watch);
  expect(await alarmOf('disk-low')).toMatchObject({
    ...{ state: 'active-unacknowledged', rings: 'morning', words: '4 % of the disk of the database is free.' },
  });
  free = 0.4;
  await looks(watch);
  await clock.advance(61_000);
  await looks(watch);
  expect(await alarmOf('disk-low')).toMatchObject({ state: 'returned-unacknowledged' });
  free = null;
});

test('a broker is told of once it has been away for a minute, by what the server that listens said of it a moment ago', async () => {
  const watch = watchOf();
  const { db } = database().connection;
  const air = { name: 'box air', role: 'environment', unit: 'degC', rateHz: 0.1 } as const;
  const topics = [{ filter: 'air', channel: air, valuePath: null, time: null, timeUS: 1 }];
  const place = { labId: demoIds.lab, rigId: demoIds.rig, address: 'mqtt://sensors.lan:1883', userName: null, password: null, ca: null };
  const broker = await insertBroker(db, { ...place, topics, madeAt: clock.utcMs(), madeBy: 'Ott' });
  const since = new Date(clock.utcMs()).toISOString();
  const says = (state: 'away' | 'connected') => {
    const status = {
      state,
      since,
      reason: state === 'away' ? 'no answer in 10 s' : null,
      toldAt: new Date(clock.utcMs()).toISOString(),
      topics: [],
    };
    return tellBrokerStatus(db, broker, status);
  };
  await says('away');
  await looks(watch);
  await clock.advance(59_000);
  await says('away');
  await looks(watch);
  expect(await alarmOf('broker-away')).toMatchObject({ state: 'normal' });
  await clock.advance(2_000);
  await looks(watch);
  expect(await alarmOf('broker-away')).toMatchObject({
    ...{ state: 'active-unacknowledged', rings: 'morning', rigId: demoIds.rig },
    words: `mqtt://sensors.lan:1883 does not answer since ${since.slice(11, 19)} UTC: no answer in 10 s. Nothing comes into box air.`,
  });
  // Nobody listens any more: what was said is not of now.
  await clock.advance(70_000);
  await looks(watch);
  await clock.advance(3_000);
  await looks(watch);
  expect(await alarmOf('broker-away')).toMatchObject({ state: 'returned-unacknowledged' });
  await removeBroker(db, { ...place, id: broker.id, at: clock.utcMs(), by: 'Ott' });
});

test('a camera that gave no picture is told of after a minute, until it gives one, or nobody has asked it for an hour', async () => {
  const watch = watchOf();
  const { db } = database().connection;
  const of = { labId: demoIds.lab, rigId: demoIds.rig };
  const secrets = { userName: null, password: null, tokenHash: null };
  const facts = { name: 'Above the case', kind: 'address', address: 'http://camera.lan/still.jpg' } as const;
  const camera = await insertCamera(db, { ...of, ...facts, ...secrets, madeAt: clock.utcMs(), madeBy: 'Ott' });
  const says = (reason: string | null) => tellCameraStatus(db, camera, { askedAt: new Date(clock.utcMs()).toISOString(), reason });
  await says('it answered with a page of text, not a picture');
  await looks(watch);
  await clock.advance(61_000);
  await looks(watch);
  expect(await alarmOf('camera-away')).toMatchObject({
    ...{ state: 'active-unacknowledged', rings: 'morning', rigId: demoIds.rig },
    words: '"Above the case" gave no picture: it answered with a page of text, not a picture.',
  });
  await says(null);
  await looks(watch);
  await clock.advance(61_000);
  await looks(watch);
  expect(await alarmOf('camera-away')).toMatchObject({ state: 'returned-unacknowledged' });
  await says('no answer in 8 s');
  await clock.advance(3_601_000);
  await looks(watch);
  await clock.advance(61_000);
  await looks(watch);
  expect(await alarmOf('camera-away')).toMatchObject({ state: 'returned-unacknowledged' });
  await removeCamera(db, { ...of, id: camera.id, at: clock.utcMs(), by: 'Ott' });
});

test('a channel that had samples and has none for longer than its limit is told, until one comes; another watch knows of it', async () => {
  const limit = { kind: 'silence', atMostS: 300, rings: 'allowed' } as const;
  await addLimit(database().connection.db, {
    ...{ labId: demoIds.lab, channelId: demoIds.channel, limit },
    ...{ changedAt: clock.utcMs(), changedBy: 'Tam Ferrowdale' },
  });
  let watch = watchOf();
  await looks(watch);
  expect(await alarmOf('channel-silent')).toBeUndefined();
  await store([clock.utcMs()], () => 0.001);
  const last = new Date(clock.utcMs()).toISOString().slice(11, 19);
  await clock.advance(299_000);
  await looks(watch);
  expect(await alarmOf('channel-silent')).toBeUndefined();
  await clock.advance(2_000);
  await looks(watch);
  expect(await alarmOf('channel-silent')).toMatchObject({
    ...{ state: 'active-unacknowledged', rings: 'allowed', rigId: demoIds.rig, words: `deflection has had no sample since ${last} UTC.` },
  });
  await store([clock.utcMs()], () => 0.001);
  watch = watchOf();
  await looks(watch);
  await clock.advance(61_000);
  await looks(watch);
  expect(await alarmOf('channel-silent')).toMatchObject({ state: 'returned-unacknowledged' });
});

test('a pendulum that swings too far waits for a period; where it holds the run it rings at once, and says why the run is held', async () => {
  run = { state: 'running', reasonCode: '', reason: '' };
  const now = clock.utcMs();
  const instants = Array.from({ length: 60 }, (_, index) => now - index * (periodMs / 20));
  await store(instants, (utcMs) => 0.029 * Math.sin((2 * Math.PI * utcMs) / periodMs));
  const watch = watchOf();
  await looks(watch);
  expect(await alarmOf('excursion')).toMatchObject({ state: 'normal', words: expect.stringContaining('The deflection reaches') });
  const rings = async () => (await database().connection.db.select().from(jobs)).filter(({ kind }) => kind === 'alarm.ring');
  const before = (await rings()).length;
  run = { state: 'held', reasonCode: 'excursion', reason: 'The pendulum still swings out too far.' };
  await watch.look();
  expect(await alarmOf('excursion')).toMatchObject({
    ...{ state: 'active-unacknowledged', rings: 'always', raisedAt: now, words: 'The pendulum still swings out too far.' },
  });
  expect(await rings()).toHaveLength(before + 1);
  // Nothing is told twice, and what the slow look finds takes none of it back.
  await looks(watch);
  expect(await alarmOf('excursion')).toMatchObject({ state: 'active-unacknowledged', words: 'The pendulum still swings out too far.' });
  expect(await rings()).toHaveLength(before + 1);
});
