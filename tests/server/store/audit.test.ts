import { appendAudit, auditPage } from '@/server/store/audit';
import { verifyChain } from '@/shared/archive/chain';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs, makeLab, sha256 } from './rows';

const database = databaseOfThisFile();
const db = () => database().connection.db;
const fact = (labId: string, n: number) => ({
  labId,
  who: { id: null, name: 'server' },
  kind: 'lab.changed',
  data: { n, gone: undefined, odd: '\u0000' },
  utcMs: eveningUtcMs + n,
});

test('entries of many writers at once make one chain without gaps', async () => {
  const lab = await makeLab(db());
  await Promise.all(Array.from({ length: 20 }, (_, n) => db().transaction((tx) => appendAudit(tx, fact(lab.id, n), sha256))));
  const rows = (await auditPage(db(), { labId: lab.id, beforeSeq: null, limit: 100 })).reverse();
  expect(
    verifyChain(
      rows.map(({ labId: _lab, ...link }) => link),
      sha256,
    ),
  ).toMatchObject({ valid: true, events: 20 });
});

test('each lab has a chain of its own', async () => {
  const [one, two] = [await makeLab(db()), await makeLab(db())];
  await db().transaction((tx) => appendAudit(tx, fact(one.id, 1), sha256));
  await db().transaction((tx) => appendAudit(tx, fact(two.id, 1), sha256));
  expect((await auditPage(db(), { labId: two.id, beforeSeq: null, limit: 10 })).map((row) => row.seq)).toEqual([1]);
});

test('an act that fails leaves no entry and no gap', async () => {
  const lab = await makeLab(db());
  await expect(
    db().transaction(async (tx) => {
      await appendAudit(tx, fact(lab.id, 1), sha256);
      throw new Error('the act failed');
    }),
  ).rejects.toThrow('the act failed');
  await db().transaction((tx) => appendAudit(tx, fact(lab.id, 2), sha256));
  expect((await auditPage(db(), { labId: lab.id, beforeSeq: null, limit: 10 })).map((row) => [row.seq, row.data.n])).toEqual([[1, 2]]);
});

test('pages go back from the newest', async () => {
  const lab = await makeLab(db());
  for (let n = 1; n <= 5; n += 1) await db().transaction((tx) => appendAudit(tx, fact(lab.id, n), sha256));
  expect((await auditPage(db(), { labId: lab.id, beforeSeq: null, limit: 2 })).map((row) => row.seq)).toEqual([5, 4]);
  expect((await auditPage(db(), { labId: lab.id, beforeSeq: 4, limit: 2 })).map((row) => row.seq)).toEqual([3, 2]);
});
