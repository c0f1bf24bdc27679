import { mkdirSync, mkdtempSync, readFileSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { sql } from 'drizzle-orm';
import { demoIds, demoPeople, seedDemo } from '@/db/demo/seed';
import { connect } from '@/db/connect';
import { anchorAudit } from '@/server/boot/audit-anchor';
import { main, type Restored } from '@/server/boot/backup';
import { main as verifyAudit } from '@/server/boot/audit-verify';
import { armRig, currentArm, newestArm } from '@/server/store/arms';
import { auditPage } from '@/server/store/audit';
import { createSampleStore } from '@/server/store/sample-store';
import { findSchedule, insertSchedule } from '@/server/store/schedules';
import type { SchedulePlan } from '@/shared/schedule/plan';
import { tablesOf } from '@/server/store/whole-database';
import { FakeS3 } from '@/tests/support/fake-s3';
import { freshDatabase, type TestDatabase } from '@/tests/support/database';
import { announceFile } from '@/server/store/files';
import { beginImport } from '@/server/store/import-files';
import { makeRun, runStart, sha256 } from '../store/rows';

/** A lab is kept, lost, and put back from one file. */

jest.setTimeout(120_000);
const nowUtcMs = Date.parse('2031-02-14T20:00:00Z');
const folder = mkdtempSync(join(tmpdir(), 'evenfall-backup-'));
const file = join(folder, 'lab.tar.gz');
const states = { lab: join(folder, 'state'), other: join(folder, 'other-state') };
let lab: TestDatabase;
let other: TestDatabase;
beforeAll(async () => {
  [lab, other] = [await freshDatabase(), await freshDatabase()];
  await seedDemo(lab.connection, { nowUtcMs, hashPassword: async () => 'none', sha256 });
  const utcMs = Float64Array.from({ length: 500 }, (_, index) => nowUtcMs + 100 * index);
  const { rows } = await lab.connection.db.execute<{ id: string }>(sql`select id from channels limit 1`);
  const value = utcMs.map(Math.sin);
  await createSampleStore(lab.connection).append(demoIds.lab, rows[0]?.id ?? '', { utcMs, value });
  mkdirSync(join(states.lab, 'journal'), { recursive: true });
  writeFileSync(join(states.lab, 'journal', 'run.jsonl'), '{"version":1}\n');
  writeFileSync(join(states.lab, 'made-again'), 'not worth keeping');
  if (!(await makeRun(lab.connection.db, start))) throw new Error('the run was refused');
  await keepFile('night', broughtIn);
  await keepFile('lost', 'this one is lost');
  await anchorAudit(lab.connection.db, { stateDir: states.lab, nowUtcMs });
});
afterAll(async () => {
  await lab.drop();
  await other.drop();
  rmSync(folder, { recursive: true });
});

const start = runStart(demoIds.lab, demoIds.rig);
const broughtIn = 'time,angle\n0,1\n';
const fileOf = (stateDir: string, name: string) => join(stateDir, 'files', 'imports', name);

/** A file that an import refers to, in the folder of the lab's server. */
async function keepFile(name: string, text: string): Promise<void> {
  const { db } = lab.connection;
  const bytes = Buffer.from(text);
  await announceFile(db, { name: `imports/${name}`, bytes: bytes.length, sha256: sha256(text) }, nowUtcMs);
  const { id } = await beginImport(db, {
    ...{ labId: demoIds.lab, runId: start.runId, fileName: name, createdAt: nowUtcMs, createdBy: 'Tam' },
  });
  await db.execute(sql`update imports set object_name = ${`imports/${name}`} where id = ${id}`);
  mkdirSync(join(states.lab, 'files', 'imports'), { recursive: true });
  writeFileSync(fileOf(states.lab, name), bytes);
}

const run = (database: TestDatabase, stateDir: string, ...args: string[]) =>
  runWith({ DATABASE_URL: database.url, EVENFALL_STATE_DIR: stateDir }, args);

async function runWith(environment: Record<string, string>, args: string[], atUtcMs = nowUtcMs) {
  const said = { out: '', err: '' };
  const output = { out: (text: string) => void (said.out += text), err: (text: string) => void (said.err += text) };
  const code = await main(args, environment, { output, nowUtcMs: atUtcMs });
  return { code, ...said };
}

test('a file that was lost or changed does not keep all else from being kept, and is named', async () => {
  writeFileSync(fileOf(states.lab, 'night'), broughtIn.replace('1', '2'));
  rmSync(fileOf(states.lab, 'lost'));
  const said = await run(lab, states.lab, 'backup', file);
  expect(said).toMatchObject({ code: 2, err: expect.stringContaining('could not be read whole: imports/lost, imports/night') });
  expect(JSON.parse(said.out)).toMatchObject({ files: 0 });
  writeFileSync(fileOf(states.lab, 'night'), broughtIn);
  writeFileSync(fileOf(states.lab, 'lost'), 'this one is lost');
});

test('a backup is one file for its owner alone', async () => {
  const said = await run(lab, states.lab, 'backup', file);
  expect(said).toMatchObject({ code: 0, err: '' });
  expect(JSON.parse(said.out)).toMatchObject({ files: 2 });
  expect(statSync(file).mode & 0o777).toBe(0o600);
  expect(await run(lab, states.lab, 'backup')).toMatchObject({ code: 2, err: expect.stringContaining('Usage') });
});

test('it is put back into an empty database: every row, the files that were brought in, the journals and heads, the audit chain whole', async () => {
  const before = await tablesOf(lab.connection.db);
  const server = connect({ url: other.url, maxConnections: 1 });
  await server.db.execute(sql`select 1`);
  expect(await run(other, states.other, 'restore', file)).toMatchObject({ code: 2, err: expect.stringMatching(/connected/) });
  await server.close();
  const restored = await run(other, states.other, 'restore', file);
  expect(restored).toMatchObject({ code: 0, err: '' });
  expect((JSON.parse(restored.out) as Restored).labs).toEqual([{ name: 'Quillfen Gravity Laboratory', entries: 1 }]);
  const again = connect({ url: other.url, maxConnections: 1 });
  expect(await tablesOf(again.db)).toEqual(before);
  const sums = sql`select count(*)::int as count, sum(value) as sum from samples`;
  expect((await again.db.execute(sums)).rows).toEqual((await lab.connection.db.execute(sums)).rows);
  await expect(again.db.execute(sql`delete from audit`)).rejects.toMatchObject({
    cause: { message: expect.stringContaining('never changed') },
  });
  await again.close();
  expect(readFileSync(join(states.other, 'journal', 'run.jsonl'), 'utf8')).toBe('{"version":1}\n');
  expect(() => statSync(join(states.other, 'made-again'))).toThrow();
  expect(readFileSync(fileOf(states.other, 'night'), 'utf8')).toBe(broughtIn);
  expect(statSync(fileOf(states.other, 'night')).mode & 0o777).toBe(0o600);
  const silent = { out: () => undefined, err: () => undefined };
  expect(await verifyAudit({ DATABASE_URL: other.url, EVENFALL_STATE_DIR: states.other }, silent)).toBe(0);
});

test('an arm of the time of the backup is ended, in the audit chain too, and no start of the time between is told to be missed', async () => {
  const { db } = lab.connection;
  const ownerId = demoPeople.find(({ role }) => role === 'owner')?.id ?? '';
  const arm = { labId: demoIds.lab, rigId: demoIds.rig, name: 'Ilse Marrowby', note: '', armedById: ownerId, bootId: '7' };
  await db.transaction((tx) => armRig(tx, { ...arm, nowUtcMs, untilUtcMs: nowUtcMs + 40 * 3_600_000 }));
  const plan: SchedulePlan = { kind: 'weekly', days: ['fri', 'sat', 'sun'], time: '22:00', from: '2031-02-14', until: null };
  const maker = { userId: ownerId, name: 'Ilse Marrowby', at: nowUtcMs };
  const { lab: labId, rig: rigId, shortProtocol: protocolId, massSet: massSetId } = demoIds;
  const scheduleId = await insertSchedule(db, { labId, rigId, protocolId, protocolRevision: 1, massSetId, plan, notes: '' }, maker);
  const armed = join(folder, 'armed.tar.gz');
  expect(await run(lab, states.lab, 'backup', armed)).toMatchObject({ code: 0 });

  // A night later; the door was opened meanwhile, and what ended the arm is in no backup.
  const laterUtcMs = nowUtcMs + 20 * 3_600_000;
  const said = await runWith({ DATABASE_URL: other.url, EVENFALL_STATE_DIR: states.other }, ['restore', armed, '--replace'], laterUtcMs);
  expect(said).toMatchObject({ code: 0, err: '' });
  const restored = JSON.parse(said.out) as Restored;
  expect(restored).toMatchObject({ armsEnded: 1, labs: [{ entries: 2 }] });
  const again = connect({ url: other.url, maxConnections: 1 });
  const where = { labId: demoIds.lab, rigId: demoIds.rig };
  expect(await currentArm(again.db, { ...where, nowUtcMs: laterUtcMs })).toBeNull();
  expect(await newestArm(again.db, where)).toMatchObject({ endedAt: laterUtcMs, endedWhy: 'a backup was put back' });
  expect((await auditPage(again.db, { labId: demoIds.lab, beforeSeq: null, limit: 1 }))[0]).toMatchObject({
    kind: 'rig.arm-ended',
    at: new Date(laterUtcMs).toISOString(),
    data: { rigId: demoIds.rig, why: 'a backup was put back', who: { id: null, name: 'the restore' } },
  });
  expect(await findSchedule(again.db, demoIds.lab, scheduleId)).toMatchObject({ state: 'active', decidedUntilAt: laterUtcMs });
  await again.close();
  const silent = { out: () => undefined, err: () => undefined };
  expect(await verifyAudit({ DATABASE_URL: other.url, EVENFALL_STATE_DIR: states.other }, silent)).toBe(0);
});

test('files go from a folder into a bucket where that is configured at the restore, and from there into the next backup', async () => {
  const fake = new FakeS3();
  const place = { EVENFALL_S3_BUCKET: 'nights', EVENFALL_S3_ENDPOINT: await fake.listen() };
  const bucket = {
    ...place,
    EVENFALL_S3_KEY_ID: fake.keyId,
    EVENFALL_S3_SECRET: 'test-secret',
    DATABASE_URL: other.url,
    EVENFALL_STATE_DIR: states.other,
  };
  expect(await runWith(bucket, ['restore', file, '--replace'])).toMatchObject({ code: 0, err: '' });
  expect(fake.kept.get('/nights/imports/night')?.toString()).toBe(broughtIn);
  const again = join(folder, 'again.tar.gz');
  const said = await runWith(bucket, ['backup', again]);
  expect(said).toMatchObject({ code: 0, err: '' });
  expect(JSON.parse(said.out)).toMatchObject({ files: 2 });
  await fake.close();
});

test('a database with something in it is not thrown away by mistake, and a spoilt file changes nothing', async () => {
  expect(await run(other, states.other, 'restore', file)).toMatchObject({ code: 2, err: expect.stringMatching(/not empty.*--replace/) });
  const bytes = readFileSync(file);
  writeFileSync(join(folder, 'cut.tar.gz'), bytes.subarray(0, bytes.length / 2));
  for (const name of ['cut.tar.gz', 'missing.tar.gz'])
    expect(await run(other, states.other, 'restore', join(folder, name), '--replace')).toMatchObject({ code: 2 });
  const again = connect({ url: other.url, maxConnections: 1 });
  expect(new Map(await tablesOf(again.db)).get('users')).toBe(5);
  await again.close();
});
