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
