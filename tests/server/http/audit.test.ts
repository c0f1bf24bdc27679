import { sql } from 'drizzle-orm';
import { demoIds, demoPeople } from '@/db/demo/seed';
import { appendAudit, auditLinks } from '@/server/store/audit';
import type { AuditCheck, AuditEntry } from '@/shared/contracts/audit';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol, sha256 } from '@/tests/support/lab-server';
import { makeRun, runStart } from '../store/rows';

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

test('what people do beside the runs is in the chain: drafts by turns, a line that is tried, a trial call, files, browsers that take push messages', async () => {
  const of = async (kind: string) =>
    ((await lab.as('owner', 'GET', `${path}/audit?kind=${kind}`).expect(200)).body.items as AuditEntry[])
      .map(({ who, data: { who: _account, ...data } }) => ({ who, data }))
      .reverse();
  const made = await lab.as('operator', 'POST', `${path}/protocols`).send({ document: quickProtocol() }).expect(201);
  const protocolId = made.body.id as string;
  let etag = made.headers.etag as string;
  const save = async (who: 'operator' | 'keeper', name: string) => {
    const document = quickProtocol({ name });
    const saved = await lab.as(who, 'PUT', `${path}/protocols/${protocolId}`).set('If-Match', etag).send({ document }).expect(200);
    etag = saved.headers.etag as string;
  };
  // As an editor does, again and again while somebody types; then somebody else, and the next day the first one.
  for (const name of ['N', 'Ni', 'Night']) await save('operator', name);
  await save('keeper', 'Night, long');
  await save('keeper', 'Night, long');
  await lab.advance(16 * 60_000);
  await save('keeper', 'Night, short');
  expect((await of('protocol.edited')).map(({ who, data }) => [who, data])).toEqual([
    ['Ilse Marrowby', { protocolId, name: 'N', fromVersion: 1 }],
    ['Casimir Thornquist', { protocolId, name: 'Night, long', fromVersion: 4 }],
    ['Casimir Thornquist', { protocolId, name: 'Night, short', fromVersion: 5 }],
  ]);

  const line = { kind: 'simulated' };
  await lab.as('keeper', 'POST', `${path}/rigs/${demoIds.rig}/link/try`).send(line).expect(200);
  await lab.as('keeper', 'POST', `${path}/on-call/trial`).expect(200);
  await lab.services.idle();
  expect((await of('rig.link-tried')).map(({ data }) => data)).toEqual([{ rigId: demoIds.rig, with: line, ok: true }]);
  expect((await of('member.trial-sent')).map(({ who }) => who)).toEqual(['Casimir Thornquist']);

  const start = runStart(demoIds.lab, demoIds.rig);
  expect(await makeRun(db(), start)).toBe(true);
  const files = `${path}/runs/${start.runId}/imports`;
  const begun = await lab.as('analyst', 'POST', files).send({ fileName: 'night.csv' }).expect(201);
  const importId = begun.body.id as string;
  await lab.as('analyst', 'DELETE', `${path}/imports/${importId}`).expect(204);
  const file = { runId: start.runId, importId, fileName: 'night.csv' };
  expect((await of('run.file-begun')).map(({ data }) => data)).toEqual([file]);
  expect((await of('run.file-given-up')).map(({ data }) => data)).toEqual([file]);

  const keys = { p256dh: 'B'.repeat(87), auth: 'A'.repeat(22) };
  const browser = { endpoint: 'https://push.example/ilse', keys, device: 'Telephone' };
  const taken = await lab.as('operator', 'POST', '/push/subscriptions').send(browser).expect(201);
  // A page says it again each time; that is nothing new.
  await lab.as('operator', 'POST', '/push/subscriptions').send(browser).expect(201);
  await lab.as('operator', 'DELETE', `/push/subscriptions/${taken.body.id as string}`).expect(204);
  expect((await of('person.device-added')).map(({ who, data }) => [who, data])).toEqual([['Ilse Marrowby', { device: 'Telephone' }]]);
  expect((await of('person.device-removed')).map(({ data }) => data)).toEqual([{ device: 'Telephone' }]);
});
