import { sql } from 'drizzle-orm';
import { demoIds, demoPeople } from '@/db/demo/seed';
import { appendAudit, auditLinks } from '@/server/store/audit';
import type { AuditCheck, AuditEntry } from '@/shared/contracts/audit';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, sha256 } from '@/tests/support/lab-server';

/** What owners read of the audit chain: who did what and when, and how far the chain is whole. */

const database = databaseOfThisFile();
const db = () => database().connection.db;
let lab: LabServer;
const path = `/labs/${demoIds.lab}`;
const ilse = demoPeople.find(({ role }) => role === 'operator') ?? { id: '', name: '' };

beforeAll(async () => {
  lab = await LabServer.start(database());
  // The lab lies in Zurich: an hour ahead of UTC in winter.
  const acts = [
    { at: '2031-01-09T22:59:59.000Z', kind: 'run.started', who: ilse },
    { at: '2031-01-09T23:00:00.000Z', kind: 'run.hold-asked', who: ilse },
    { at: '2031-01-10T22:59:59.000Z', kind: 'running.other', who: { id: null, name: 'server' } },
    {
      at: '2031-01-10T23:00:00.000Z',
      kind: 'run.started',
      who: { id: null, name: 'server' },
      data: { odd: '\u0000', by: `"who":{"id":"${ilse.id}"` },
    },
  ];
  for (const { at, kind, who, data = {} } of acts) {
    const fact = { labId: demoIds.lab, who: { id: who.id, name: who.name }, kind, data, utcMs: Date.parse(at) };
    await db().transaction((tx) => appendAudit(tx, fact, sha256));
  }
}, 60_000);
afterAll(() => lab.stop());

async function entries(query: string): Promise<string[]> {
  const { body } = await lab.as('owner', 'GET', `${path}/audit?${query}`).expect(200);
  return (body.items as AuditEntry[]).map(({ at, kind, who }) => `${at.slice(0, 10)} ${kind} ${who}`).reverse();
}

test('by person, by what was done, and by days of the lab’s own zone', async () => {
  expect(await entries(`who=${ilse.id}&kind=run`)).toEqual([
    `2031-01-09 run.started ${ilse.name}`,
    `2031-01-09 run.hold-asked ${ilse.name}`,
  ]);
  expect(await entries('kind=run&who=server')).toEqual(['2031-01-10 run.started server']);
  expect(await entries('kind=run.started&from=2031-01-09&until=2031-01-11')).toEqual([
    `2031-01-09 run.started ${ilse.name}`,
    '2031-01-10 run.started server',
  ]);
  expect(await entries('from=2031-01-10&until=2031-01-10')).toEqual([
    `2031-01-09 run.hold-asked ${ilse.name}`,
    '2031-01-10 running.other server',
  ]);
});

test('a filter goes on over pages; what is no filter is refused with the field', async () => {
  const first = await lab.as('owner', 'GET', `${path}/audit?kind=run&limit=2`).expect(200);
  expect(first.headers.link).toContain('kind=run');
  const second = await lab.as('owner', 'GET', `${path}/audit?kind=run&limit=2&cursor=${String(first.body.next)}`).expect(200);
  expect([...first.body.items, ...second.body.items].map(({ kind }: AuditEntry) => kind)).toEqual([
    ...['run.started', 'run.hold-asked', 'run.started'],
  ]);
  for (const wrong of ['who=Ilse', 'kind=%25', 'from=yesterday', 'until=2031-02-30']) {
    const { body } = await lab.as('owner', 'GET', `${path}/audit?${wrong}`).expect(400);
    expect(body.errors[0].path).toBe(wrong.split('=')[0]);
  }
});

test('the check says how far the chain is whole, who stands in it and what they did', async () => {
  const check = async () => (await lab.as('owner', 'GET', `${path}/audit-check`).expect(200)).body as AuditCheck;
  const whole = await check();
  const last = (await auditLinks(db(), { labId: demoIds.lab, afterSeq: 0, limit: 5000 })).at(-1);
  expect(whole).toMatchObject({ valid: true, complete: true, upToSeq: last?.seq, hash: last?.hash, broken: null });
  expect(whole.people).toEqual(
    expect.arrayContaining([
      { id: ilse.id, name: ilse.name },
      { id: 'server', name: 'server' },
    ]),
  );
  expect(whole.kinds).toEqual(expect.arrayContaining(['run.hold-asked', 'run.started', 'running.other']));
  const changed = (last?.seq ?? 0) - 1;
  await db().execute(sql.raw('alter table audit disable trigger all'));
  await db().execute(sql.raw(`update audit set kind = 'run.stop-asked' where lab_id = '${demoIds.lab}' and seq = ${changed}`));
  await db().execute(sql.raw('alter table audit enable trigger all'));
  expect(await check()).toMatchObject({
    valid: false,
    upToSeq: changed - 1,
    broken: { seq: changed, why: expect.stringContaining('was changed') },
  });
});
