import pino from 'pino';
import { demoIds, seedDemo } from '@/db/demo/seed';
import { LeaseKeeper, type LeaseParts } from '@/server/boot/lease-keeper';
import { RigTaking } from '@/server/boot/take-rigs';
import { VirtualClock } from '@/server/engine/virtual-clock';
import type { Clock } from '@/server/interfaces/clock';
import type { StationRig } from '@/server/interfaces/rig-stations';
import { databaseOfThisFile } from '@/tests/support/database';
import { sha256 } from '@/tests/support/lab-server';

const database = databaseOfThisFile();
const rig = { labId: demoIds.lab, rigId: demoIds.rig };
const startUtcMs = Date.UTC(2031, 1, 14, 20);
const leaseMs = 3_000;

let unanswered = 0;
/** Lets what was asked of the database be answered before time goes on, and what is asked thereupon. */
const settle = async (): Promise<void> => {
  do await new Promise<void>((resolve) => void setImmediate(resolve));
  while (unanswered > 0);
};

/** From now on what was asked and not answered is counted. */
function countQuestions(): void {
  const { pool } = database().connection;
  const query = pool.query.bind(pool) as (...args: unknown[]) => unknown;
  const counted = (...args: unknown[]) => {
    unanswered += 1;
    return Promise.resolve(query(...args)).finally(() => (unanswered -= 1));
  };
  Object.assign(pool, { query: counted });
}
let clock = new VirtualClock(startUtcMs, settle);
/** Processes that are known to have ended. */
const gone = new Set<string>();
const processes = { isGone: (holder: string) => gone.has(holder), forget: (holder: string) => void gone.delete(holder) };

function keeper(holder: string, more: Partial<LeaseParts> = {}): LeaseKeeper {
  return new LeaseKeeper({
    ...{ database: database().connection, clock, log: pino({ level: 'silent' }), holder, leaseMs, processes, graceMs: 4_000 },
    ...{ onTaken: () => undefined, onLost: () => undefined, onDatabase: () => undefined },
    ...more,
  });
}

/** As a process that is killed, and whose end nobody knows of. */
async function die(driver: LeaseKeeper): Promise<void> {
  Object.assign(driver, { renew: async () => undefined, renewRegularly: () => undefined });
  await driver.idle();
}

/** Until the function that it returns is called the database answers nobody. */
function databaseAway(): () => void {
  const { pool } = database().connection;
  const working = { query: pool.query.bind(pool) };
  Object.assign(pool, { query: () => Promise.reject(new Error('connect ECONNREFUSED')) });
  return () => void Object.assign(pool, working);
}

/**
 * Sets the clock by which the database's sessions go from now on by so much: `clock_timestamp` of an own schema stands before PostgreSQL's, as its
 * manual allows where `pg_catalog` is named in the search path ("The System Catalog Schema").
 */
async function setDatabaseClock(byMs: number): Promise<void> {
  await database().connection.pool.query(`
    create schema if not exists set_clock;
    create or replace function set_clock.clock_timestamp() returns timestamptz volatile language sql
      as $$ select pg_catalog.clock_timestamp() + interval '${byMs} milliseconds' $$`);
}

beforeAll(async () => {
  const { pool } = database().connection;
  pool.on('connect', (client) => void client.query('set search_path = set_clock, public, pg_catalog'));
  await seedDemo(database().connection, { nowUtcMs: startUtcMs, hashPassword: async () => 'no password in this test', sha256 });
  countQuestions();
});

test('a lease that is being renewed while the server ends is free for the next one at once', async () => {
  clock = new VirtualClock(startUtcMs, async () => undefined);
  for (let round = 1; round <= 10; round += 1) {
    const first = keeper(`first ${round}`);
    expect(await first.epochOf(rig)).not.toBeNull();
    first.renewRegularly();
    await clock.advance(leaseMs / 3);
    await first.close();
    const next = keeper(`next ${round}`);
    expect(await next.epochOf(rig)).not.toBeNull();
    await next.close();
  }
});

test('a rig whose driver is gone is taken over when its lease has run out, with a higher epoch; the one that comes back lets go', async () => {
  clock = new VirtualClock(startUtcMs + 3_600_000, settle);
  const lost: string[] = [];
  const taken: number[] = [];
  const first = keeper('first', { onLost: ({ rigId }) => lost.push(rigId) });
  const second = keeper('second', { onTaken: () => taken.push(clock.monotonicMs()) });
  const epoch = (await first.epochOf(rig)) as number;
  first.renewRegularly();
  second.renewRegularly();
  expect(await second.epochOf(rig)).toBeNull();
  await clock.advance(10_000);
  expect([taken, lost]).toEqual([[], []]);

  // As a process that is frozen: nothing of it runs, then all of it goes on.
  const frozen = first as unknown as { renew(): Promise<void> };
  const renew = frozen.renew.bind(first);
  frozen.renew = async () => undefined;
  const frozenMs = clock.monotonicMs();
  await clock.advance(10_000, () => taken.length > 0);
  // Taken over within 5 s: the lease, and the next look at it.
  expect((taken[0] ?? Infinity) - frozenMs).toBeLessThanOrEqual(5_000);
  expect(await second.epochOf(rig)).toBe(epoch + 1);
  frozen.renew = renew;
  await clock.advance(2_000);
  expect(lost).toEqual([demoIds.rig]);
  expect(first.holds(demoIds.rig)).toBe(false);
  await first.close();
  await second.close();
});

/** The clock of a machine whose wall clock is off by so much, set anew while it runs. */
const offBy = (byMs: () => number): Clock => ({
  monotonicMs: () => clock.monotonicMs(),
  utcMs: () => clock.utcMs() + byMs(),
  after: (delayMs, task) => clock.after(delayMs, task),
});

describe.each([60_000, -60_000])('two servers whose wall clocks are %i ms apart, and that of PostgreSQL set by as much', (apartMs) => {
  test('a living driver keeps its rig, and that of a dead one is taken within 5 s', async () => {
    clock = new VirtualClock(startUtcMs + 9_000_000, settle);
    const taken: number[] = [];
    let [drivers, others] = [0, apartMs];
    const driver = keeper(`driver ${apartMs}`, { clock: offBy(() => drivers) });
    const standby = keeper(`standby ${apartMs}`, { clock: offBy(() => others), onTaken: () => taken.push(clock.monotonicMs()) });
    expect(await driver.epochOf(rig)).not.toBeNull();
    driver.renewRegularly();
    expect(await standby.epochOf(rig)).toBeNull();
    await clock.advance(10_000);
    expect(taken).toEqual([]);
    [drivers, others] = [apartMs, 0];
    await setDatabaseClock(apartMs);
    await clock.advance(10_000);
    await setDatabaseClock(-apartMs);
    await clock.advance(10_000);
    expect([taken, driver.holds(demoIds.rig)]).toEqual([[], true]);

    await die(driver);
    const diedMs = clock.monotonicMs();
    await setDatabaseClock(2 * apartMs);
    await clock.advance(10_000, () => taken.length > 0);
    expect((taken[0] ?? Infinity) - diedMs).toBeLessThanOrEqual(5_000);
    await standby.close();
  });
});

test('where the database itself stood still the driver has time to renew its lease', async () => {
  clock = new VirtualClock(startUtcMs + 12_000_000, settle);
  const taken: number[] = [];
  const driver = keeper('driver');
  const standby = keeper('standby', { onTaken: () => taken.push(clock.monotonicMs()) });
  await driver.epochOf(rig);
  await standby.epochOf(rig);
  driver.renewRegularly();
  await clock.advance(5_000);
  // Neither the driver's renewals nor the other's looks are answered; then both are, in an order that nobody knows.
  const back = databaseAway();
  await clock.advance(20_000);
  back();
  await clock.advance(10_000);
  expect([taken, driver.holds(demoIds.rig)]).toEqual([[], true]);
  await driver.close();
  await clock.advance(1_000);
  expect(taken).toHaveLength(1);
  await standby.close();
});

test('the rigs of a process that is known to have ended are taken over at once, by one that waits and by one that comes', async () => {
  clock = new VirtualClock(startUtcMs + 5_400_000, settle);
  const taken: number[] = [];
  const first = keeper('killed');
  const waiting = keeper('waiting', { onTaken: () => taken.push(clock.monotonicMs()) });
  const epoch = (await first.epochOf(rig)) as number;
  expect(await waiting.epochOf(rig)).toBeNull();
  const killedMs = clock.monotonicMs();
  gone.add('killed');
  await clock.advance(leaseMs / 2);
  // With the next look at it, which is four times a second.
  expect((taken[0] ?? Infinity) - killedMs).toBeLessThanOrEqual(250);
  expect(await waiting.epochOf(rig)).toBe(epoch + 1);
  gone.add('waiting');
  const next = keeper('next');
  expect(await next.epochOf(rig)).toBe(epoch + 2);
  await next.close();
});

test('a database that does not answer for more than 4 s is told of, with the beginning, and so is its return', async () => {
  clock = new VirtualClock(startUtcMs + 7_200_000, settle);
  const told: (number | null)[] = [];
  const one = keeper('one', { onDatabase: (sinceUtcMs) => told.push(sinceUtcMs) });
  await one.epochOf(rig);
  one.renewRegularly();
  await clock.advance(5_000);
  const back = databaseAway();
  await clock.advance(3_500);
  expect(told).toEqual([]);
  await clock.advance(3_000);
  expect(told).toEqual([startUtcMs + 7_200_000 + 6_000]);
  back();
  await clock.advance(1_500);
  expect(told[1]).toBeNull();
  await one.close();
});

describe('the taking over of rigs', () => {
  /** A process that holds every lease, with a second rig whose line is set up as the first one's. */
  function taking(put: (rigId: string) => void) {
    clock = new VirtualClock(startUtcMs, settle);
    const [opened, recovered, later]: [string[], number[], Promise<unknown>[]] = [[], [], []];
    const services = {
      ...{ clock, database: database().connection, log: pino({ level: 'silent' }), watchedLabs: () => [] },
      background: (work: Promise<unknown>) => later.push(work),
      access: { refresh: async () => undefined },
      supervisor: { recover: async () => void recovered.push(clock.monotonicMs()) },
    };
    const stations = {
      put: async ({ id }: { id: string }) => {
        put(id);
        opened.push(id);
      },
    };
    const keep = { load: async () => undefined };
    const side = { leases: { holds: () => true, epochOf: async () => 1 }, arms: keep, locks: { ...keep, locksOf: () => [] }, stations };
    return { rigs: new RigTaking(...([services, side] as unknown as ConstructorParameters<typeof RigTaking>)), opened, recovered, later };
  }

  test('is tried again a second later when the database goes away at that very moment', async () => {
    let failures = 2;
    const { rigs, opened, recovered, later } = taking(() => {
      if (failures > 0) throw Object.assign(new Error('the connection broke'), { code: 'ECONNRESET', failures: (failures -= 1) });
    });
    await expect(rigs.takenOver(rig)).rejects.toThrow('the connection broke');
    await clock.advance(900);
    expect([opened, later]).toEqual([[], []]);
    await clock.advance(100);
    await expect(later[0]).rejects.toThrow('the connection broke');
    await clock.advance(1_000);
    await later[1];
    expect([opened, recovered, later.length]).toEqual([[demoIds.rig], [clock.monotonicMs()], 2]);
  });

  test('goes on with the others where the line of one cannot be opened', async () => {
    const { rigs, opened, recovered } = taking((rigId) => {
      if (rigId === 'broken') throw new Error('no such baud rate');
    });
    const found = (id: string) => ({ ...rig, id }) as unknown as StationRig;
    await rigs.takeAll([found('broken'), found('sound')]);
    expect([opened, recovered.length]).toEqual([['sound'], 1]);
  });
});
