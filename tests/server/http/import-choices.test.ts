import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol } from '@/tests/support/lab-server';
import { deflectionFiles } from './deflection-files';

jest.setTimeout(60_000);

const database = databaseOfThisFile();
let lab: LabServer;
let runId: string;
let startUtcMs: number;
let endUtcMs: number;

beforeAll(async () => {
  lab = await LabServer.start(database());
  runId = await lab.run(quickProtocol());
  const view = await lab.until(runId, 'finished');
  startUtcMs = Date.parse(view.startedAt ?? '');
  endUtcMs = Date.parse(view.endedAt ?? '');
  await commit(await sent(deflection()), 'readout').expect(200);
}, 60_000);
afterAll(() => lab.stop());

const { deflection, check, commit, sent } = deflectionFiles(() => ({ lab, runId, startUtcMs, endUtcMs }));
const samplesOf = async (channelName: string): Promise<number> => {
  const result = await database().connection.pool.query<{ n: string }>(
    "select count(*) as n from samples join channels on channels.id = samples.channel_id where channels.name = $1 and channels.source = 'import'",
    [channelName],
  );
  return Number(result.rows[0]?.n);
};

test('a file that differs is compared row by row before anything is stored, and what counts is chosen', async () => {
  const differs = deflection((line, index) => (index === 5 ? line.replace(/,.*/, ',99') : line));
  const id = await sent(differs);
  const { findings, ok } = (await check(id).expect(200)).body;
  expect(ok).toBe(true);
  expect(findings).toMatchObject({ fresh: 0, different: 1, frozen: false, among: { rows: 0 }, outsideRun: { before: 0, after: 0 } });
  expect(findings.equal).toBe(findings.held - 1);
  expect(findings.differing).toEqual([
    { row: 7, at: new Date(startUtcMs + 10_000).toISOString(), stored: Number((100 * Math.sin(5 / 40)).toFixed(3)), inFile: 99 },
  ]);
  const kept = await commit(id, 'readout', { choices: { sameInstant: 'keep' } }).expect(200);
  expect(kept.body).toMatchObject({ stored: 0, other: 1, leftOut: 0 });
  expect((await commit(id, 'readout').expect(409)).body.detail).toContain('is stored already');
  const replaced = await commit(await sent(differs), 'readout', { choices: { sameInstant: 'replace' } }).expect(200);
  expect(replaced.body).toMatchObject({ stored: 0, other: 1 });
  await commit(await sent(deflection()), 'readout', { choices: { sameInstant: 'replace' } }).expect(200);
});

test('a second record of the same time is stored only where that is chosen', async () => {
  const beside = deflection((line) => line.replace(/^[^,]*/, (at) => new Date(Date.parse(at) + 500).toISOString()));
  const id = await sent(beside);
  const { findings } = (await check(id).expect(200)).body;
  expect(findings.among.rows).toBeGreaterThan(20);
  const refused = await commit(id, 'readout').expect(409);
  expect(refused.body.detail).toMatch(/^Nothing was stored: \d+ rows fall among samples that readout holds at other instants/);
  expect(refused.body.errors[0].path).toBe('choices.among');
  const before = await samplesOf('readout');
  const left = await commit(id, 'readout', { choices: { among: 'leave-out' } }).expect(200);
  expect(left.body.leftOut).toBe(findings.among.rows);
  expect(await samplesOf('readout')).toBe(before + left.body.stored);
});

test('a file with a few values out of reach is refused, or stored without them where that is chosen', async () => {
  const id = await sent(deflection((line, index) => (index === 0 || index === 9 ? line.replace(/,.*/, ',-90000') : line)));
  const { ok, problemCount, findings } = (await check(id, {}, 'knocked').expect(200)).body;
  expect([ok, problemCount, findings.outOfReach]).toEqual([false, 2, { rows: 2, leavable: true }]);
  await commit(id, 'knocked').expect(422);
  const stored = await commit(id, 'knocked', { choices: { outOfReach: 'leave-out' } }).expect(200);
  expect(stored.body.leftOut).toBe(2);
  expect(await samplesOf('knocked')).toBe(stored.body.stored);
  const allWrong = await sent(deflection());
  expect((await check(allWrong, { unit: 'rad' }, 'knocked in rad').expect(200)).body.findings.outOfReach.leavable).toBe(false);
  await commit(allWrong, 'knocked in rad', { unit: 'rad', choices: { outOfReach: 'leave-out' } }).expect(422);
});

test('a file that reaches beyond the run can be cut to it', async () => {
  const longer = `${deflection()}${[60, 62].map((s) => `${new Date(endUtcMs + 1000 * s).toISOString()},1`).join('\n')}\n`;
  const id = await sent(longer);
  const { findings } = (await check(id, {}, 'longer').expect(200)).body;
  expect(findings).toMatchObject({ held: 0, outsideRun: { before: 0, after: 2 }, gaps: { count: 1 } });
  const stored = await commit(id, 'longer', { choices: { outsideRun: 'leave-out' } }).expect(200);
  expect(stored.body).toMatchObject({ leftOut: 2, stored: findings.fresh - 2 });
});
