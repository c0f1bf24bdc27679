import { randomUUID } from 'node:crypto';
import { existsSync, mkdirSync, mkdtempSync, readdirSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { pino } from 'pino';
import { demoIds, demoPeople, seedDemo } from '@/db/demo/seed';
import { MemoryArmKeeper } from '@/server/boot/arm-keeper';
import { MemoryLockKeeper } from '@/server/boot/lock-keeper';
import { StandingFiles } from '@/server/boot/standing-files';
import { VirtualClock } from '@/server/engine/virtual-clock';
import type { PersonalLock } from '@/server/interfaces/lock-keeper';
import { armRig, endArm, newestArm } from '@/server/store/arms';
import { auditLinks } from '@/server/store/audit';
import type { Connection } from '@/server/store/database';
import { insertLock, liftLock, standingLocks } from '@/server/store/locks';
import { createStandingStore } from '@/server/store/standing-store';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, sha256, World } from '@/tests/support/lab-server';

/** Locks and ends of arms that took effect while the database was away, on real files, with a process that is gone at every point between. */

jest.setTimeout(60_000);
const database = databaseOfThisFile();
const startUtcMs = Date.UTC(2031, 1, 14, 20);
const rig = { labId: demoIds.lab, rigId: demoIds.rig };
const [keeper] = demoPeople.filter(({ role }) => role === 'keeper');
const by = { id: keeper?.id ?? '', name: keeper?.name ?? '' };
let folder: string;

beforeAll(async () => {
  await seedDemo(database().connection, { nowUtcMs: startUtcMs, hashPassword: async () => 'none', sha256, link: 'simulated' });
});
beforeEach(() => {
  folder = join(mkdtempSync(join(tmpdir(), 'evenfall-standing-')), 'standing');
});
afterEach(async () => {
  rmSync(join(folder, '..'), { recursive: true, force: true });
  const { db } = database().connection;
  for (const { id } of await standingLocks(db, rig))
    await db.transaction((tx) => liftLock(tx, { ...rig, lockId: id, by: 'x', why: null, nowUtcMs: startUtcMs }));
});

const refused = () => Promise.reject(Object.assign(new Error('connect ECONNREFUSED 127.0.0.1'), { code: 'ECONNREFUSED' }));

/** A process as far as it knows who may move the rig; `loses` its database when told. */
function process() {
  const connection: Connection = { ...database().connection };
  const clock = new VirtualClock(startUtcMs + 60_000, () => Promise.resolve());
  const works = new Set<Promise<unknown>>();
  const parts = {
    ...{ store: createStandingStore(connection, sha256), standing: new StandingFiles(folder), clock, log: pino({ level: 'silent' }) },
    background: (work: Promise<unknown>) => void works.add(work),
    onChange: () => undefined,
  };
  const arms = new MemoryArmKeeper(parts);
  const locks = new MemoryLockKeeper({ ...parts, newId: randomUUID, onSet: () => undefined });
  const load = async () => {
    await arms.load(rig);
    await locks.load(rig);
  };
  const loses = () => {
    connection.db = { transaction: refused } as unknown as Connection['db'];
  };
  return { arms, locks, load, loses, idle: () => Promise.all(works) };
}

const wanted = { ...rig, userId: by.id, name: by.name, note: '', setUtcMs: startUtcMs + 30_000 };
const lockOf = (id: string): PersonalLock => ({ ...wanted, id });
const armed = () =>
  database().connection.db.transaction((tx) =>
    armRig(tx, {
      ...rig,
      name: by.name,
      note: '',
      armedById: by.id,
      bootId: 'boot-1',
      nowUtcMs: startUtcMs,
      untilUtcMs: startUtcMs + 3_600_000,
    }),
  );
const audited = async (kind: string) =>
  (await auditLinks(database().connection.db, { labId: rig.labId, afterSeq: 0, limit: 500 })).filter((link) => link.kind === kind).length;
const files = () => (existsSync(folder) ? readdirSync(folder) : []);

test('a lock that was answered while the database was away stands after the process is gone, is stored once, and leaves no file', async () => {
  const before = await audited('rig.lock-set');
  const gone = process();
  gone.loses();
  const lock = gone.locks.set(wanted);
  await gone.locks.kept();
  expect(files()).toHaveLength(1);
  const next = process();
  await next.load();
  expect(next.locks.locksOf(rig.rigId)).toMatchObject([{ id: lock.id, setUtcMs: wanted.setUtcMs, name: by.name }]);
  expect((await standingLocks(database().connection.db, rig)).map(({ id }) => id)).toEqual([lock.id]);
  expect([await audited('rig.lock-set'), files()]).toEqual([before + 1, []]);
});

test('an arm that was ended while the database was away does not stand again after the process is gone', async () => {
  await armed();
  const gone = process();
  await gone.load();
  expect(gone.arms.armOf(rig.rigId)).not.toBeNull();
  gone.loses();
  gone.arms.end(rig, 'the key was turned off', by);
  await gone.arms.kept();
  const next = process();
  await next.load();
  expect(next.arms.armOf(rig.rigId)).toBeNull();
  expect(next.arms.endedOf(rig.rigId)).toEqual({ name: by.name, why: 'the key was turned off', atUtcMs: startUtcMs + 60_000 });
  expect(files()).toEqual([]);
});

test('gone before the file was whole: nobody was answered, nothing of it counts, and it harms nothing', async () => {
  mkdirSync(folder, { recursive: true });
  writeFileSync(join(folder, `${rig.rigId}.lock-set.${randomUUID()}.json.new`), '{"standing":1,"entry":{"kind":"lock-s');
  const next = process();
  await next.load();
  expect(next.locks.locksOf(rig.rigId)).toEqual([]);
});

test('gone between the database and the removal of the file: the lock is stored once; one that was lifted since does not come back', async () => {
  const { db } = database().connection;
  const [stands, lifted] = [lockOf(randomUUID()), lockOf(randomUUID())];
  const { setUtcMs: setAt, ...row } = lifted;
  await db.transaction(async (tx) => {
    await insertLock(tx, { ...row, setAt });
    await liftLock(tx, { ...rig, lockId: lifted.id, by: by.name, why: null, nowUtcMs: startUtcMs + 40_000 });
    await insertLock(tx, { ...row, setAt, id: stands.id });
  });
  const disk = new StandingFiles(folder);
  for (const lock of [stands, lifted]) await disk.keep({ kind: 'lock-set', lock });
  const next = process();
  await next.load();
  expect(next.locks.locksOf(rig.rigId).map(({ id }) => id)).toEqual([stands.id]);
  expect(files()).toEqual([]);
});

test('an end that is stored already, of an arm that was given anew since, ends nothing', async () => {
  const first = await armed();
  await endArm(database().connection.db, { ...rig, nowUtcMs: startUtcMs + 10_000, why: 'disarmed' });
  const second = await armed();
  const end = { ...rig, armId: first.id, why: 'disarmed', by, atUtcMs: startUtcMs + 10_000 };
  await new StandingFiles(folder).keep({ kind: 'arm-ended', end });
  const next = process();
  await next.load();
  expect(next.arms.armOf(rig.rigId)?.id).toBe(second.id);
});

test('the database goes away again while the next process brings it in: the file stays, and the turn after that does it', async () => {
  const lock = lockOf(randomUUID());
  await new StandingFiles(folder).keep({ kind: 'lock-set', lock });
  const cut = process();
  cut.loses();
  await expect(cut.locks.load(rig)).rejects.toThrow('ECONNREFUSED');
  expect(files()).toHaveLength(1);
  const next = process();
  await next.load();
  expect(next.locks.locksOf(rig.rigId).map(({ id }) => id)).toEqual([lock.id]);
});

test('where the database answers, a lock leaves no file behind; a disk that takes none is no reason not to lock', async () => {
  const living = process();
  const lock = living.locks.set(wanted);
  await living.idle();
  expect([files(), (await standingLocks(database().connection.db, rig)).map(({ id }) => id)]).toEqual([[], [lock.id]]);
  rmSync(folder, { recursive: true, force: true });
  writeFileSync(folder, 'a file where the folder should be');
  const other = process();
  other.loses();
  other.locks.set(wanted);
  await other.locks.kept();
  expect(other.locks.lockedBy(rig.rigId)).toContain('has hands in the rig');
});

test('a file of another version is told with its path, and counts as neither lock nor none', async () => {
  mkdirSync(folder, { recursive: true });
  writeFileSync(join(folder, `${rig.rigId}.lock-set.x.json`), '{"standing":2}');
  await expect(process().locks.load(rig)).rejects.toThrow(/\.lock-set\.x\.json is not to be read by this version \(1\)/);
});

test('a server that was killed between lock and end of arm: after its start the lock stands, and no arm beside it', async () => {
  const world = new World(startUtcMs);
  let lab = await LabServer.start(database(), { world });
  await lab.arm(2);
  await lab.stop();
  expect((await newestArm(database().connection.db, rig))?.endedAt).toBeNull();
  await world.standing.keep({ kind: 'lock-set', lock: lockOf(randomUUID()) });
  lab = await LabServer.start(database(), { world });
  expect(lab.services.locks.lockedBy(rig.rigId)).toContain(`${by.name} has hands in the rig`);
  expect(lab.services.arms.armOf(rig.rigId)).toBeNull();
  await lab.services.idle();
  expect((await newestArm(database().connection.db, rig))?.endedWhy).toBe(`${by.name} set a personal lock`);
  expect(await world.standing.of(rig.rigId)).toEqual([]);
  await lab.stop();
});
