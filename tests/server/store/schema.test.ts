import { sql } from 'drizzle-orm';
import { instant, timestampOfUtcMs, utcMsOfTimestamp } from '@/db/schema/columns';
import * as schema from '@/db/schema';
import { insertExclusion } from '@/server/store/exclusions';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs, makeLab, makeRig, makeRun, runStart } from './rows';

const database = databaseOfThisFile();
const run = (text: string) => database().connection.pool.query(text);

test('an instant keeps its microseconds through the database', async () => {
  const { db } = database().connection;
  const at = Date.parse('2031-05-06T07:08:09.123Z') + 0.456;
  const [lab] = await db.insert(schema.labs).values({ name: 'Quillfen', timeZone: 'Europe/Zurich', createdAt: at }).returning();
  expect(lab?.createdAt).toBeCloseTo(at, 3);
  const { rows } = await run(`select to_char(created_at at time zone 'UTC', 'YYYY-MM-DD"T"HH24:MI:SS.US') as text from labs`);
  expect(rows[0].text).toBe('2031-05-06T07:08:09.123456');
});

test('timestamps before 1970 and with other offsets are read right', () => {
  expect(timestampOfUtcMs(-0.001)).toBe('1969-12-31T23:59:59.999999Z');
  expect(utcMsOfTimestamp('1969-12-31 23:59:59.999999+00')).toBeCloseTo(-0.001, 6);
  expect(utcMsOfTimestamp('2031-05-06 09:08:09.5+05:30')).toBe(Date.parse('2031-05-06T03:38:09.500Z'));
  expect(() => timestampOfUtcMs(Number.NaN)).toThrow('finite');
  expect(instant).toBeDefined();
});

test.each(['rig_revisions', 'protocol_revisions', 'run_events', 'audit', 'exclusions', 'step_notes'])(
  '%s refuses TRUNCATE',
  async (table) => {
    await expect(run(`truncate ${table} cascade`)).rejects.toThrow('never changed or deleted');
  },
);

test('an audit row can be neither changed nor deleted', async () => {
  const [lab] = await database().connection.db.select().from(schema.labs).limit(1);
  await run(`insert into audit values ('${lab?.id}', 1, '2031-05-06T07:08:09.123Z', 'kind', '{}', 'p', 'h')`);
  await expect(run(`update audit set kind = 'other'`)).rejects.toThrow('never changed or deleted');
  await expect(run('delete from audit')).rejects.toThrow('never changed or deleted');
});

test('an exclusion is never deleted, and never changed once it is withdrawn', async () => {
  const { db } = database().connection;
  const lab = await makeLab(db);
  const start = runStart(lab.id, await makeRig(db, lab.id));
  await makeRun(db, start);
  const stretch = { labId: lab.id, runId: start.runId, startUtcMs: eveningUtcMs, endUtcMs: eveningUtcMs + 1 };
  await insertExclusion(db, { ...stretch, madeAt: eveningUtcMs, madeBy: 'Tam', reason: 'a door' });
  await expect(run('delete from exclusions')).rejects.toThrow('never changed or deleted');
  await expect(run(`update exclusions set reason = 'no door'`)).rejects.toThrow('never changed or deleted');
  await run(`update exclusions set withdrawn_at = now(), withdrawn_by = 'Tam', withdrawn_reason = 'no door'`);
  await expect(run('update exclusions set withdrawn_at = null')).rejects.toThrow('never changed or deleted');
});

describe('samples', () => {
  const lab = '11111111-1111-4111-8111-111111111111';
  const put = (at: string) => run(`insert into samples values ('${lab}', '${lab}', '${at}', 1)`);
  const placeOf = async (at: string) =>
    (await run(`select tableoid::regclass::text as place from samples where at = '${at}'`)).rows[0]?.place;

  test('lie in the default partition until the month has its own, then move there', async () => {
    await put('2031-05-31T23:59:59.999999Z');
    await put('2031-06-01T00:00:00Z');
    expect(await placeOf('2031-06-01T00:00:00Z')).toBe('samples_default');
    const { rows } = await run(`select make_sample_partitions('2031-05-20T12:00:00Z', 3) as made`);
    expect(rows[0].made).toBe(3);
    expect(await placeOf('2031-05-31T23:59:59.999999Z')).toBe('samples_2031_05');
    expect(await placeOf('2031-06-01T00:00:00Z')).toBe('samples_2031_06');
    await put('2031-07-31T23:59:59Z');
    expect(await placeOf('2031-07-31T23:59:59Z')).toBe('samples_2031_07');
  });

  test('making partitions again makes none', async () => {
    const { rows } = await run(`select make_sample_partitions('2031-05-20T12:00:00Z', 3) as made`);
    expect(rows[0].made).toBe(0);
  });

  test('a reading through the table finds all of them', async () => {
    const { rows } = await database().connection.db.execute(sql`select count(*)::int as n from samples`);
    expect(rows[0]?.n).toBe(3);
  });
});

test('a row of one lab cannot point into another', async () => {
  const { db } = database().connection;
  const [a, b] = await db
    .insert(schema.labs)
    .values(['A', 'B'].map((name) => ({ name, timeZone: 'UTC', createdAt: 0 })))
    .returning();
  const [rig] = await db
    .insert(schema.rigs)
    .values({ labId: a?.id ?? '', name: 'North bench', revision: 1, createdAt: 0 })
    .returning();
  const setIn = (labId: string) =>
    db.insert(schema.massSets).values({ labId, rigId: rig?.id ?? '', label: 'lead', sources: { shape: 'none' }, createdAt: 0 });
  await expect(setIn(b?.id ?? '')).rejects.toThrow();
  await setIn(a?.id ?? '');
});

test('an id that is no UUID finds nothing instead of failing', async () => {
  const { db } = database().connection;
  expect(await db.query.labs.findMany({ where: (lab, { eq }) => eq(lab.id, "no-such-lab' or true") })).toEqual([]);
});
