import { mkdtempSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { sql } from 'drizzle-orm';
import { anchorAudit } from '@/server/boot/audit-anchor';
import { main, type LabAudit } from '@/server/boot/audit-verify';
import { appendAudit } from '@/server/store/audit';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs, makeLab, sha256 } from '../store/rows';

const database = databaseOfThisFile();
const db = () => database().connection.db;
const stateDir = mkdtempSync(join(tmpdir(), 'evenfall-audit-'));

async function verify(): Promise<{ code: number; err: string; lab(id: string): LabAudit }> {
  const said = { out: '', err: '' };
  const code = await main(
    { DATABASE_URL: database().url, EVENFALL_STATE_DIR: stateDir },
    { out: (text) => void (said.out += text), err: (text) => void (said.err += text) },
  );
  const labs = (JSON.parse(said.out) as { labs: LabAudit[] }).labs;
  return { code, err: said.err, lab: (id) => labs.find(({ labId }) => labId === id) as LabAudit };
}

async function labWithEntries(count: number): Promise<string> {
  const lab = await makeLab(db());
  const who = { id: null, name: 'server' };
  for (let n = 0; n < count; n += 1) {
    const fact = { labId: lab.id, who, kind: 'lab.changed', data: { n, odd: '\u0000' }, utcMs: eveningUtcMs + n };
    await db().transaction((tx) => appendAudit(tx, fact, sha256));
  }
  return lab.id;
}

/** As whoever owns the database could: the guard against changes is switched off. */
async function tamper(change: string): Promise<void> {
  await db().execute(sql.raw('alter table audit disable trigger all'));
  await db().execute(sql.raw(change));
  await db().execute(sql.raw('alter table audit enable trigger all'));
}

test('chains that are whole, an empty one too, give 0', async () => {
  const [lab, empty] = [await labWithEntries(4), await labWithEntries(0)];
  const said = await verify();
  expect(said).toMatchObject({ code: 0, err: '' });
  expect(said.lab(lab)).toMatchObject({ entries: 4, valid: true, brokenSeq: null });
  expect(said.lab(empty)).toMatchObject({ entries: 0, head: null, valid: true });
});

test('an entry that was changed, taken out or put in another place is named, and only its lab is broken', async () => {
  const [whole, changed, thinned] = [await labWithEntries(3), await labWithEntries(3), await labWithEntries(3)];
  await tamper(`update audit set data = '{"n":7,"who":{"id":null,"name":"server"}}' where lab_id = '${changed}' and seq = 2`);
  await tamper(`delete from audit where lab_id = '${thinned}' and seq = 1`);
  const said = await verify();
  expect(said.code).toBe(2);
  expect(said.err).toMatch(new RegExp(`${changed}.*broken at seq 2.*was changed`));
  expect(said.err).toMatch(new RegExp(`${thinned}.*broken at seq 1.*missing`));
  expect(said.lab(changed)).toMatchObject({ valid: false, brokenSeq: 2 });
  expect(said.lab(whole)).toMatchObject({ valid: true });
});

test('an end that was cut off, or a chain written anew, is seen by the heads written down before', async () => {
  const cut = await labWithEntries(5);
  await anchorAudit(db(), { stateDir, nowUtcMs: eveningUtcMs });
  await tamper(`delete from audit where lab_id = '${cut}' and seq > 3`);
  const said = await verify();
  expect(said.lab(cut)).toMatchObject({ valid: false, brokenSeq: 4, why: expect.stringMatching(/cut off/) });
  const who = { id: null, name: 'server' };
  for (const n of [8, 9])
    await db().transaction((tx) => appendAudit(tx, { labId: cut, who, kind: 'lab.changed', data: { n }, utcMs: eveningUtcMs }, sha256));
  expect((await verify()).lab(cut)).toMatchObject({ brokenSeq: 5, why: expect.stringMatching(/written anew/) });
});

test('without a database it says what is missing', async () => {
  let err = '';
  expect(await main({}, { out: () => undefined, err: (text) => void (err += text) })).toBe(2);
  expect(err).toMatch(/DATABASE_URL/);
});
