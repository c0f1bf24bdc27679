import { demoIds } from '@/db/demo/seed';
import { formatClock } from '@/shared/lib/format-time';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol } from '@/tests/support/lab-server';

/** A run that ends on a whole pair before the end of its protocol: asked for by a person, or for the night window. */

const database = databaseOfThisFile();
let lab: LabServer;
beforeAll(async () => {
  lab = await LabServer.start(database());
}, 60_000);
afterAll(() => lab.stop());
jest.setTimeout(60_000);

const base = `/labs/${demoIds.lab}`;
/** So many pairs of about a minute and a quarter. */
const pairs = (times: number) =>
  quickProtocol({
    steps: [
      { kind: 'home' },
      {
        kind: 'repeat',
        times,
        steps: [
          { kind: 'swing', to: 'near' },
          { kind: 'dwell', for_s: 30 },
          { kind: 'swing', to: 'far' },
          { kind: 'dwell', for_s: 30 },
        ],
      },
    ],
  });
const factsOf = (runId: string) => lab.services.supervisor.driverOf(runId)?.facts();
const inFirstDwell = (runId: string) => lab.advance(600_000, () => factsOf(runId)?.current?.kind === 'dwell');
const post = (who: 'viewer' | 'operator', runId: string, leaf: string, body: object = {}) =>
  lab.as(who, 'POST', `${base}/runs/${runId}/${leaf}`).send(body);

test('is asked for by whoever may hold, shown to all, taken back by who may resume, and audited', async () => {
  const runId = await lab.run(pairs(4));
  await inFirstDwell(runId);
  const planned = Date.parse((await lab.view(runId)).predictedEndAt ?? '');
  await post('viewer', runId, 'finish-early').expect(202);
  const asked = await lab.view(runId);
  expect(asked.finishing).toMatchObject({ by: expect.any(String), overBy: null, withdrawnBy: null });
  expect(planned - Date.parse(asked.predictedEndAt ?? '')).toBeGreaterThan(3 * 60_000);
  const again = await post('operator', runId, 'finish-early').expect(409);
  expect(again.body.detail).toContain('The run is to end early already');
  const tappedAt = () => ({ tappedAt: lab.nowIso() });
  await post('viewer', runId, 'withdraw-finish', tappedAt()).expect(403);
  const late = { tappedAt: new Date(lab.clock.utcMs() - 6_000).toISOString() };
  expect((await post('operator', runId, 'withdraw-finish', late).expect(409)).body.detail).toContain('it counts for 5 s');
  await post('operator', runId, 'withdraw-finish', tappedAt()).expect(202);
  expect((await lab.view(runId)).finishing).toMatchObject({ withdrawnBy: 'Ilse Marrowby' });
  await post('operator', runId, 'finish-early').expect(202);
  const view = await lab.until(runId, 'finished');
  expect(view).toMatchObject({ dwellsDone: 2, dwellsGood: 2, dwellsPlanned: 8 });
  const audit = await lab.as('owner', 'GET', `${base}/audit`).expect(200);
  const kinds = (audit.body.items as { kind: string }[]).map(({ kind }) => kind).filter((kind) => kind.startsWith('run.finish'));
  expect(kinds).toHaveLength(3);
  expect(kinds).toEqual(expect.arrayContaining(['run.finish-asked', 'run.finish-withdrawn']));
});

test('a hold that moves a run beyond its night window costs the last pairs: it is over in time, and the lab is told', async () => {
  const runId = await lab.run(pairs(10));
  await inFirstDwell(runId);
  const { timeZone } = (await lab.as('viewer', 'GET', base).expect(200)).body as { timeZone: string };
  const clock = (utcMs: number) => formatClock(utcMs, { timeZone });
  const plannedEndUtcMs = factsOf(runId)?.predictedEndUtcMs ?? 0;
  // On a whole minute, one to two after the planned end.
  const untilUtcMs = 60_000 * (Math.ceil(plannedEndUtcMs / 60_000) + 1);
  const nightWindow = { from: clock(lab.clock.utcMs() - 3_600_000), until: clock(untilUtcMs) };
  await lab.as('keeper', 'PUT', `${base}/rigs/${demoIds.rig}/hours`).send({ nightWindow, blackouts: [] }).expect(200);
  await lab.advance(200_000);
  expect((await lab.view(runId)).finishing).toBeNull();
  await lab.intervene(runId, 'hold').expect(202);
  await lab.advance(240_000);
  await lab.intervene(runId, 'resume').expect(202);
  await lab.advance(400_000, () => factsOf(runId)?.finishing != null);
  expect((await lab.view(runId)).finishing).toMatchObject({ by: '', overBy: new Date(untilUtcMs).toISOString(), withdrawnBy: null });
  await lab.advance(200_000);
  const standing = (await lab.as('viewer', 'GET', `${base}/alarms`).expect(200)).body as { items: { code: string; words: string }[] };
  expect(standing.items.find(({ code }) => code === 'late-finish')?.words).toContain(`The night window ends at ${nightWindow.until}`);
  const view = await lab.until(runId, 'finished');
  expect(Date.parse(view.endedAt ?? '')).toBeLessThanOrEqual(untilUtcMs);
  const steps = (await lab.as('viewer', 'GET', `${base}/runs/${runId}/steps?limit=500`).expect(200)).body as {
    items: { kind: string; station: string; outcome: string }[];
  };
  const dwells = steps.items.filter(({ kind, outcome }) => kind === 'dwell' && outcome === 'done').map(({ station }) => station);
  expect(dwells.length % 2).toBe(0);
  expect(dwells.length).toBeGreaterThan(8);
  expect(dwells.length).toBeLessThan(20);
  await lab.as('keeper', 'PUT', `${base}/rigs/${demoIds.rig}/hours`).send({ nightWindow: null, blackouts: [] }).expect(200);
});

describe('few good dwells by half time', () => {
  let secret = '';
  beforeAll(async () => {
    const channels = [{ name: 'air', role: 'environment', unit: 'degC', rateHz: 0.1 }];
    const made = await lab.as('owner', 'POST', `${base}/rigs/${demoIds.rig}/devices`).send({ name: 'thermometer', channels }).expect(201);
    secret = String((made.body as { secret: string }).secret);
  });
  const tells = (value: number) =>
    lab
      .as('viewer', 'POST', '/samples')
      .set('authorization', `Bearer ${secret}`)
      .set('content-type', 'application/x-ndjson')
      .send(JSON.stringify({ time_utc: lab.nowIso(), value }))
      .expect(200);
  /** The air of the room is at `airOf(pairs done)` °C; a dwell is good below 22 °C. */
  async function passes(runId: string, airOf: (pairsDone: number) => number, until: () => boolean): Promise<void> {
    for (let strides = 0; strides < 150 && !until(); strides += 1) {
      await tells(airOf(Math.floor((factsOf(runId)?.dwellsDone ?? 0) / 2)));
      await lab.advance(10_000);
    }
  }
  const started = async (times = 6) => {
    await tells(21);
    return lab.run({ ...pairs(times), goodWhen: { channels: [{ channel: 'air', below: 22 }] } });
  };
  const few = async () => {
    const { items } = (await lab.as('viewer', 'GET', `${base}/alarms`).expect(200)).body as { items: { code: string; words: string }[] };
    return items.find(({ code }) => code === 'few-good')?.words;
  };

  test('end the run with the pair under way, which is told and may be taken back once and for all', async () => {
    const runId = await started();
    await passes(
      runId,
      () => 24,
      () => factsOf(runId)?.finishing != null,
    );
    expect(factsOf(runId)?.dwellsDone).toBeGreaterThanOrEqual(6);
    await lab.advance(60_000);
    expect((await lab.view(runId)).finishing).toMatchObject({ by: '', overBy: null, withdrawnBy: null });
    await lab.as('operator', 'POST', `${base}/runs/${runId}/withdraw-finish`).send({ tappedAt: lab.nowIso() }).expect(202);
    await passes(
      runId,
      () => 24,
      () => (factsOf(runId)?.dwellsDone ?? 0) >= 9,
    );
    expect(factsOf(runId)?.finishing).toMatchObject({ by: '', withdrawnBy: 'Ilse Marrowby' });
    expect(await few()).toBe('0 of 6 dwells are good so far; 12 are planned.');
    await lab.intervene(runId, 'stop').expect(202);
    await lab.until(runId, 'stopped');
  });

  test('so the run is over on a whole pair, and its log says why', async () => {
    const runId = await started();
    await passes(
      runId,
      () => 24,
      () => factsOf(runId)?.finishing != null,
    );
    const view = await lab.until(runId, 'finished');
    expect(view.dwellsDone % 2).toBe(0);
    expect(view.dwellsDone).toBeLessThan(view.dwellsPlanned);
    const { items } = (await lab.as('viewer', 'GET', `${base}/runs/${runId}/events?limit=500`).expect(200)).body as {
      items: { kind: string; data: Record<string, unknown> }[];
    };
    expect(items.filter(({ kind }) => kind === 'finish-asked').map(({ data }) => data)).toEqual([{ by: 'few good dwells' }]);
    expect(items.find(({ kind }) => kind === 'finished')?.data).toMatchObject({
      early: 'on a whole pair, for few of its dwells were good',
    });
  });

  test('do not, where the last four show that what was wrong is over: the whole night is measured', async () => {
    const runId = await started(10);
    await passes(
      runId,
      (done) => (done < 3 ? 24 : 21),
      () => factsOf(runId)?.state === 'finished' || (factsOf(runId)?.dwellsDone ?? 0) > 19,
    );
    const view = await lab.until(runId, 'finished');
    expect(view).toMatchObject({ dwellsDone: 20, finishing: null });
  });
});
