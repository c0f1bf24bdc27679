import { demoIds } from '@/db/demo/seed';
import { askForThinning } from '@/server/http/work/thinning-job';
import type { KeptChannel } from '@/shared/contracts/retention';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol } from '@/tests/support/lab-server';
import { deflectionFiles } from './deflection-files';

jest.setTimeout(60_000);

const database = databaseOfThisFile();
const dayMs = 86_400_000;
const base = `/labs/${demoIds.lab}`;
let lab: LabServer;
let secret: string;
let channelId: string;
let startUtcMs: number;
let runId: string;
let endUtcMs: number;

const view = async () => {
  const { body } = await lab.as('viewer', 'GET', `${base}/retention`).expect(200);
  return { lab: body.lab, channel: (body.channels as KeptChannel[]).find(({ channel }) => channel.id === channelId) };
};
const decide = (who: 'keeper' | 'operator', body: object) => lab.as(who, 'PUT', `${base}/retention`).send(body);
const dryRun = (query: object) => lab.as('viewer', 'GET', `${base}/retention/dry-run`).query(query);
const thin = async () => {
  await askForThinning(lab.services);
  await lab.services.idle();
};
const aDayLater = () => database().connection.pool.query("update retention_rules set decided_at = decided_at - interval '1 day'");
const append = (lines: readonly object[]) =>
  lab
    .as('viewer', 'POST', '/samples')
    .set('Cookie', '')
    .set('Authorization', `Bearer ${secret}`)
    .set('Content-Type', 'application/x-ndjson')
    .send(lines.map((line) => JSON.stringify(line)).join('\n'));
const at = (utcMs: number) => new Date(utcMs).toISOString();
/** Every half second: four in each two seconds. */
const value = (index: number) => (index % 4) * 10;

beforeAll(async () => {
  lab = await LabServer.start(database());
  runId = await lab.run(quickProtocol());
  const run = await lab.until(runId, 'finished');
  startUtcMs = Date.parse(run.startedAt ?? '');
  endUtcMs = Date.parse(run.endedAt ?? '');
  const made = await lab
    .as('owner', 'POST', `${base}/rigs/${demoIds.rig}/devices`)
    .send({ name: 'Box', channels: [{ name: 'box air', role: 'environment', unit: 'degC', rateHz: 2 }] })
    .expect(201);
  secret = made.body.secret;
  const channels = (await lab.as('viewer', 'GET', `${base}/rigs/${demoIds.rig}/channels`).expect(200)).body.items;
  channelId = channels.find(({ name }: { name: string }) => name === 'box air').id;
  // Thirty minutes of a night of twenty days ago, and some of this one.
  for (const [fromMs, count] of [
    [startUtcMs - 20 * dayMs, 3600],
    [startUtcMs, 60],
  ] as const) {
    const from = Math.floor(fromMs / 2000) * 2000;
    const utcMs = Float64Array.from({ length: count }, (_, index) => from + index * 500);
    await lab.services.samples.append(demoIds.lab, channelId, { utcMs, value: Float64Array.from(utcMs, (_, index) => value(index)) });
  }
}, 60_000);
afterAll(() => lab.stop());

test('everything is kept for ever until somebody decides otherwise, and a dry run tells what would go', async () => {
  expect(await view()).toMatchObject({ lab: null, channel: { rule: null, keepDays: null, holdsFrom: null, thinned: null } });
  await thin();
  const { body } = await dryRun({ channelId, keepDays: 10 }).expect(200);
  expect(body).toMatchObject({ samples: 3600, kept: 0, channels: 1 });
  expect(Date.parse(body.fromAt)).toBe(Math.floor((startUtcMs - 20 * dayMs) / 2000) * 2000);
  expect(Date.parse(body.toAt) - Date.parse(body.fromAt)).toBe(1_800_000);
  expect((await dryRun({ channelId, keepDays: 25 }).expect(200)).body).toEqual({
    samples: 0,
    fromAt: null,
    toAt: null,
    kept: 0,
    channels: 1,
  });
  await dryRun({ channelId, keepDays: 6 }).expect(400);
  await dryRun({ channelId: demoIds.rig, keepDays: 10 }).expect(404);
});

test('a keeper decides, an operator does not; it takes hold a day later and can be taken back until then', async () => {
  await decide('operator', { channelId, keep: 10 }).expect(403);
  await decide('keeper', { channelId, keep: 3 }).expect(400);
  await decide('keeper', { channelId: null, keep: 'as-lab' }).expect(400);
  await decide('keeper', { channelId, keep: 10 }).expect(204);
  const { channel } = await view();
  expect(channel).toMatchObject({ keepDays: 10, rule: { keepDays: 10, asLab: false } });
  expect(Date.parse(channel?.holdsFrom ?? '') - lab.clock.utcMs()).toBeCloseTo(dayMs, -4);
  await thin();
  expect((await view()).channel?.thinned).toBeNull();
});

test('a channel that goes by the rule of the lab again waits for a day as well', async () => {
  await decide('keeper', { channelId: null, keep: 10 }).expect(204);
  await decide('keeper', { channelId, keep: 'for-ever' }).expect(204);
  await aDayLater();
  expect((await dryRun({ keepDays: 10 }).expect(200)).body.samples).toBe(0);
  await thin();
  await decide('keeper', { channelId, keep: 'as-lab' }).expect(204);
  expect((await dryRun({ keepDays: 10 }).expect(200)).body.samples).toBe(3600);
  await thin();
  expect((await view()).channel).toMatchObject({ keepDays: 10, thinned: null, rule: { asLab: true } });
});

test('then old samples go, once, with an entry in the audit; the summaries are there to be had', async () => {
  await aDayLater();
  await thin();
  await thin();
  const { channel } = await view();
  expect(channel?.thinned).toMatchObject({ samples: 3600 });
  const audit = (await lab.as('owner', 'GET', `${base}/audit`).query({ kind: 'samples' }).expect(200)).body.items;
  expect(audit.map(({ kind }: { kind: string }) => kind)).toEqual([
    'samples.thinned',
    ...Array<string>(4).fill('samples.retention-decided'),
  ]);
  expect(audit[0]).toMatchObject({ who: 'Evenfall', data: { channelId, samples: 3600, keepDays: 10 } });
  expect(audit[4].data).toMatchObject({ keep: 10, wouldGo: 3600, wouldStay: 0 });

  const full = await lab.as('viewer', 'GET', `${base}/channels/${channelId}/samples.csv`).expect(200);
  expect(full.text.trim().split('\n')).toHaveLength(1 + 60);
  expect(full.headers['evenfall-thinned']).toMatch(/^\S+Z\/\S+Z;samples=3600$/);
  const left = await lab.as('viewer', 'GET', `${base}/channels/${channelId}/summaries.csv`).expect(200);
  const [head, first, ...more] = left.text.trim().split('\n');
  expect(head).toBe('from_utc,count,mean (degC),least (degC),least_utc,greatest (degC),greatest_utc');
  const from = Math.floor((startUtcMs - 20 * dayMs) / 2000) * 2000;
  const us = (utcMs: number) => expect.stringContaining(at(utcMs).slice(0, -1));
  expect(first?.split(',')).toEqual([us(from), '4', '15', '0', us(from), '30', us(from + 1500)]);
  expect(more).toHaveLength(899);
  const some = await lab
    .as('viewer', 'GET', `${base}/channels/${channelId}/summaries.csv`)
    .query({ fromUtcMs: from + 3000, toUtcMs: from + 6000 })
    .expect(200);
  expect(
    some.text
      .trim()
      .split('\n')
      .slice(1)
      .map((line) => line.split(',')[0]),
  ).toEqual([us(from + 2000), us(from + 4000), us(from + 6000)]);
});

test('plots, the list of devices and whoever brings samples are told', async () => {
  const window = { fromUtcMs: startUtcMs - 21 * dayMs, toUtcMs: endUtcMs };
  const { body } = await lab
    .as('viewer', 'GET', `${base}/runs/${runId}/samples`)
    .query({ ...window, channelId })
    .expect(200);
  expect(body).toMatchObject({ total: 3660, thinned: [{ toUtcMs: expect.any(Number) }] });
  expect(Math.max(...body.value)).toBe(30);
  const { body: own } = await lab.as('viewer', 'GET', `${base}/runs/${runId}/samples`).query({ channelId }).expect(200);
  expect(own.thinned).toEqual([]);
  const devices = (await lab.as('viewer', 'GET', `${base}/rigs/${demoIds.rig}/devices`).expect(200)).body;
  expect(devices.channels[0].thinnedToAt).toBe((await view()).channel?.thinned?.toAt);

  const line = (utcMs: number) => ({ channel: 'box air', time_utc: at(utcMs), value: 1 });
  const late = await append([line(endUtcMs + 1000), line(startUtcMs - 20 * dayMs + 60_000)]).expect(422);
  expect(late.body.detail).toMatch(
    /^Nothing was stored. One line is wrong: line 2 lies where box air was thinned to its summaries, up to /,
  );
  await append([line(endUtcMs + 1000)]).expect(200);
});

test('a file with rows where the summaries alone are left is refused, also when it is tried', async () => {
  const { commit, check, sent } = deflectionFiles(() => ({ lab, runId, startUtcMs, endUtcMs }));
  const rows = (fromMs: number) => Array.from({ length: 60 }, (_, index) => `${at(fromMs + index * 500)},${String(index)}`);
  const file = (...froms: number[]) => `time,value\n${froms.flatMap(rows).join('\n')}\n`;
  await commit(await sent(file(startUtcMs - 20 * dayMs, startUtcMs + 1000)), 'readout').expect(200);
  await thin();
  const id = await sent(file(startUtcMs - 20 * dayMs + 250, startUtcMs + 1250));
  for (const refused of [await check(id).expect(409), await commit(id, 'readout').expect(409)])
    expect(refused.body.detail).toMatch(/^Nothing was stored: rows of the file lie where readout was thinned to its summaries, from /);
});
