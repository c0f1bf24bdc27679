import { demoIds } from '@/db/demo/seed';
import { readZip } from '@/server/evaluation/archive-files';
import type { CalibrationView } from '@/shared/contracts/calibrations';
import type { EvaluationView } from '@/shared/contracts/evaluations';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer } from '@/tests/support/lab-server';

jest.setTimeout(120_000);
const database = databaseOfThisFile();
let lab: LabServer;
let runId: string;
let channelId: string;
beforeAll(async () => {
  lab = await LabServer.start(database());
  const asked = await lab
    .as('operator', 'POST', `${labPath}/rehearsals`)
    .send({ rigId: demoIds.rig, protocolId: demoIds.shortProtocol, revision: 1, seed: 3 })
    .expect(202);
  runId = asked.body.id as string;
  await idle();
  channelId = ((await samples()).channel as { id: string }).id;
}, 90_000);
afterAll(() => lab.stop());

const labPath = `/labs/${demoIds.lab}`;
const path = `${labPath}/rigs/${demoIds.rig}/calibrations`;
const longAgo = '2020-01-01T00:00:00.000Z';
const figures = { offset: 0.001, slope: 1.05, uOffset: 0.002, uSlope: 0.01, covariance: -1e-5 };
const idle = async () => {
  await lab.services.idle();
  await lab.advance(31_000);
};
const samples = async () => (await lab.as('viewer', 'GET', `${labPath}/runs/${runId}/samples?points=10`).expect(200)).body;
const add = (body: object) =>
  lab.as('keeper', 'POST', path).send({ channelId, validFrom: longAgo, calibration: figures, note: 'Certificate 31-07', ...body });
const evaluated = async (): Promise<EvaluationView> => {
  const queued = await lab.as('analyst', 'POST', `${labPath}/runs/${runId}/evaluations`).send({}).expect(202);
  await idle();
  return (await lab.as('viewer', 'GET', `${labPath}/evaluations/${queued.body.id as string}`).expect(200)).body as EvaluationView;
};

test('a calibration counts in plots, evaluation and archive; readings stay as they were sent; what was frozen stays with its own revision', async () => {
  const before = await evaluated();
  const read = await samples();
  expect(read.calibration).toBeNull();
  const made = (await add({}).expect(201)).body as CalibrationView;
  expect(made).toMatchObject({ channelId, revision: 1, validFrom: longAgo, calibration: figures, madeBy: expect.any(String) });
  const now = await samples();
  expect(now.calibration).toEqual({ revision: 1, ...figures });
  (now.value as number[]).forEach((value, i) => expect(value).toBeCloseTo(0.001 + 1.05 * (read.value as number[])[i]!, 12));
  const raw = await lab.as('viewer', 'GET', `${labPath}/channels/${channelId}/samples.csv`).expect(200);
  expect(Number(raw.text.split('\n')[1]?.split(',')[1])).toBe((await allValues())[0]);

  const after = await evaluated();
  const ratio = (after.result?.G?.value ?? NaN) / (before.result?.G?.value ?? NaN);
  // G is near minus far times what does not change, to the little by which the torque bends over it.
  expect(Math.abs(ratio / 1.05 - 1)).toBeLessThan(0.02);
  expect(after.result?.budget?.find(({ input }) => input === 'calibration.slope')).toMatchObject({ value: 1.05, u: 0.01 });
  expect(before.result?.budget?.find(({ input }) => input === 'calibration.slope')).toBeUndefined();

  await lab.as('analyst', 'POST', `${labPath}/evaluations/${after.id}/freeze`).send({ reason: 'As registered' }).expect(200);
  await lab.advance(1000);
  expect((await add({ calibration: { ...figures, slope: 1.1 } }).expect(201)).body.revision).toBe(2);
  const zip = await lab.as('viewer', 'GET', `${labPath}/runs/${runId}/archive.zip`).responseType('blob').expect(200);
  const { resources } = JSON.parse(new TextDecoder().decode((await readZip(zip.body as Buffer)).get('datapackage.json')));
  const resource = resources.find(({ path: at }: { path: string }) => at === 'channels/deflection.csv');
  expect(resource.evenfall.calibration).toEqual({ revision: 1, ...figures });
  const again = await evaluated();
  expect(again.result?.budget?.find(({ input }) => input === 'calibration.slope')).toMatchObject({ value: 1.1 });
  const list = (await lab.as('viewer', 'GET', path).expect(200)).body.items as CalibrationView[];
  expect(list.map(({ revision, channelName }) => [channelName, revision])).toEqual([
    ['deflection', 2],
    ['deflection', 1],
  ]);
});

test('a revision that holds from later on says nothing of runs before', async () => {
  const before = await samples();
  await lab
    .as('keeper', 'POST', path)
    .send({ channelId, calibration: { ...figures, slope: 2 }, note: 'From tonight on' })
    .expect(201);
  expect((await samples()).calibration).toEqual(before.calibration);
});

test('two that come at once are two revisions, and the audit tells of each', async () => {
  const made = await Promise.all([add({ note: 'one' }).expect(201), add({ note: 'other' }).expect(201)]);
  const [a, b] = made.map(({ body }) => (body as CalibrationView).revision).sort((x, y) => x - y);
  expect(b).toBe((a ?? NaN) + 1);
  const audit = JSON.stringify((await lab.as('owner', 'GET', `${labPath}/audit`).expect(200)).body);
  expect(audit).toContain('channel.calibrated');
  await expect(database().connection.pool.query('update channel_calibrations set slope = 3')).rejects.toThrow(/never changed/);
  await expect(database().connection.pool.query('delete from channel_calibrations')).rejects.toThrow(/never changed/);
});

test.each([
  [{ calibration: { ...figures, slope: 0 } }, /slope of 0/],
  [{ calibration: { ...figures, covariance: 1 } }, /correlation would be beyond 1/],
  [{ calibration: { ...figures, uSlope: -1 } }, /not below 0/],
  [{ note: ' ' }, /say where it comes from/],
])('%j is refused in words, and nothing is kept', async (wrong, words) => {
  const before = (await lab.as('viewer', 'GET', path)).body.items.length;
  const { body } = await add(wrong).expect(400);
  expect(JSON.stringify(body.errors)).toMatch(words);
  expect((await lab.as('viewer', 'GET', path)).body.items).toHaveLength(before);
});

async function allValues(): Promise<number[]> {
  const { rows } = await database().connection.pool.query<{ value: number }>(
    'select value from samples where channel_id = $1 order by at limit 1',
    [channelId],
  );
  return rows.map(({ value }) => value);
}
