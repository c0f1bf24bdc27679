import { strFromU8, unzipSync } from 'fflate';
import { demoIds } from '@/db/demo/seed';
import { verifyChain } from '@/shared/archive/chain';
import type { ChainedEvent } from '@/shared/archive/run-records';
import type { Step } from '@/shared/protocol/document';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol, sha256 } from '@/tests/support/lab-server';

jest.setTimeout(60_000);

const database = databaseOfThisFile();
const runs = `/labs/${demoIds.lab}/runs`;
let lab: LabServer;

beforeAll(async () => {
  lab = await LabServer.start(database());
}, 60_000);
afterEach(async () => {
  const driver = lab.services.supervisor.activeOf(demoIds.rig);
  if (driver === null) return;
  await lab.intervene(driver.runId, 'stop');
  await lab.advance(60_000, () => driver.isOver());
});
afterAll(() => lab.stop());

/** Ends the server, lets time pass, and builds another on the same database and the same turntable. */
async function restart(awayMs: number): Promise<void> {
  const { world } = lab;
  await lab.stop();
  await world.clock.advance(awayMs);
  lab = await LabServer.start(database(), { world });
}

const kindOf = (runId: string) => lab.services.supervisor.driverOf(runId)?.facts().current?.kind;
const eventsOf = async (runId: string) => (await lab.as('viewer', 'GET', `${runs}/${runId}/events?limit=500`)).body.items as ChainedEvent[];
const stepsOf = async (runId: string) =>
  (await lab.as('viewer', 'GET', `${runs}/${runId}/steps`)).body.items as { path: string; outcome: string }[];

describe.each(['dwell', 'swing'] as const)('a restart of the server in a %s', (kind) => {
  test('of a run that says resume: it is carried on, the gap stands in the log, and it finishes', async () => {
    const runId = await lab.run(quickProtocol({ onInterruption: 'resume' }));
    await lab.advance(3_600_000, () => kindOf(runId) === kind);
    await lab.advance(3_000);
    await restart(8_000);
    await lab.until(runId, 'finished');
    const gap = (await eventsOf(runId)).find((event) => event.kind === 'server-restarted');
    expect(gap?.data.gapS).toBeGreaterThanOrEqual(8);
    expect((await stepsOf(runId)).filter(({ outcome }) => outcome === 'done' || outcome === 'late').map(({ path }) => path)).toEqual(
      expect.arrayContaining(['1.home', '2.swing', '3.dwell', '4.swing', '5.dwell']),
    );
    const archive = await lab.as('viewer', 'GET', `${runs}/${runId}/archive.zip`);
    expect(archive.status).toBe(200);
  });

  test('of a run that says hold: it is held, says why, and can be resumed', async () => {
    const runId = await lab.run(quickProtocol({ onInterruption: 'hold' }));
    await lab.advance(3_600_000, () => kindOf(runId) === kind);
    await lab.advance(3_000);
    await restart(8_000);
    const view = await lab.until(runId, 'held');
    expect(view.reason).toMatch(/server/i);
    expect(lab.station().link.controller()?.moving).toBe(false);
    await lab.intervene(runId, 'resume').expect(202);
    await lab.until(runId, 'finished');
  });

  test('of a run that says stop: it is stopped', async () => {
    const runId = await lab.run(quickProtocol({ onInterruption: 'stop' }));
    await lab.advance(3_600_000, () => kindOf(runId) === kind);
    await lab.advance(3_000);
    await restart(8_000);
    await lab.until(runId, 'stopped');
  });
});

test('a shuffled protocol: the seed is drawn at the start, and the orders are the same for the server that takes the run up', async () => {
  const block = (to: string): Step => ({
    kind: 'repeat',
    times: 1,
    steps: [
      { kind: 'swing', to },
      { kind: 'dwell', for_s: 20 },
    ],
  });
  const blocks: Step = { kind: 'repeat', times: 3, order: 'shuffled', steps: ['near', 'far', 'clear'].map(block) };
  const runId = await lab.run(quickProtocol({ onInterruption: 'resume', steps: [{ kind: 'home' }, blocks] }));
  await lab.advance(3_600_000, () => kindOf(runId) === 'dwell');
  await restart(8_000);
  await lab.until(runId, 'finished');
  const events = await eventsOf(runId);
  const { shuffleSeed } = events.find(({ kind }) => kind === 'run-started')?.data ?? {};
  expect(Number.isInteger(shuffleSeed)).toBe(true);
  expect(await lab.view(runId)).toMatchObject({ shuffleSeed });
  const orders = events.filter(({ kind }) => kind === 'order-drawn').map(({ data }) => data as { path: string; order: number[] });
  expect(orders.map(({ path }) => path)).toEqual([1, 2, 3].map((pass) => `2.repeat[${String(pass)}]`));
  const dwells = (await stepsOf(runId)).filter(({ path, outcome }) => path.endsWith('dwell') && outcome === 'done').map(({ path }) => path);
  expect(dwells).toEqual(orders.flatMap(({ path, order }) => order.map((number) => `${path}.${String(number)}.repeat[1].2.dwell`)));
  const zip = await lab
    .as('viewer', 'GET', `${runs}/${runId}/archive.zip`)
    .buffer(true)
    .parse((res, done) => {
      const chunks: Buffer[] = [];
      res.on('data', (chunk: Buffer) => chunks.push(chunk));
      res.on('end', () => done(null, Buffer.concat(chunks)));
    });
  expect(JSON.parse(strFromU8(unzipSync(zip.body as Buffer)['run.json'] as Uint8Array))).toMatchObject({ shuffleSeed });
});

test('a run saved by another version of the engine is left alone, blocks its rig, and is ended by whoever looked at it', async () => {
  const runId = await lab.run(quickProtocol({ name: 'From another version' }));
  await lab.advance(3_600_000, () => kindOf(runId) === 'dwell');
  await lab.intervene(runId, 'hold').expect(202);
  await lab.until(runId, 'held');
  await lab.services.idle();
  await database().connection.pool.query('update runs set chart_version = 99 where id = $1', [runId]);
  await restart(1_000);
  expect(await lab.view(runId)).toMatchObject({
    state: 'held',
    reason: expect.stringContaining('another version of the run engine (99'),
    mayResume: { ok: false },
    quarantine: { cause: 'other-version' },
  });
  const { startedAt } = await lab.view(runId);
  expect((await lab.intervene(runId, 'resume').expect(409)).body.detail).toContain('Look at the rig');
  const protocolId = await lab.issue(quickProtocol());
  await lab.arm();
  expect((await lab.askStart(protocolId).expect(409)).body.code).toBe('rig-busy');
  await lab.intervene(runId, 'stop', { who: 'keeper' }).expect(202);
  expect(await lab.view(runId)).toMatchObject({
    ...{ state: 'failed', startedAt, quarantine: null, current: null },
    reason: expect.stringContaining('Ended by Casimir Thornquist'),
  });
  const events = await eventsOf(runId);
  expect(events.at(-1)).toMatchObject({ kind: 'failed', data: { code: 'given-up', by: 'Casimir Thornquist' } });
  expect(verifyChain(events, sha256).valid).toBe(true);
  expect((await stepsOf(runId)).filter(({ outcome }) => outcome === null)).toEqual([]);
  await lab.askStart(protocolId).expect(201);
});

test('an arm that was ended stays ended over a restart, one that stands goes on standing', async () => {
  await lab.arm();
  await restart(1_000);
  expect(lab.services.arms.armOf(demoIds.rig)?.name).toBe('Ilse Marrowby');
  lab.world.controller(demoIds.rig).openInterlock();
  await lab.advance(2_000);
  lab.world.controller(demoIds.rig).closeInterlock();
  await restart(1_000);
  expect(lab.services.arms.armOf(demoIds.rig)).toBeNull();
});

test('a rehearsal in its worker thread that the end of the server cuts off is done again by the next one', async () => {
  const protocolId = await lab.issue(quickProtocol());
  const { world } = lab;
  await lab.stop();
  lab = await LabServer.start(database(), { world, overrides: { tasks: undefined } });
  const asked = await lab
    .as('operator', 'POST', `/labs/${demoIds.lab}/rehearsals`)
    .send({ rigId: demoIds.rig, protocolId, revision: 1 })
    .expect(202);
  const runId = asked.body.id as string;
  await lab.stop();
  await world.clock.advance(10_000);
  lab = await LabServer.start(database(), { world });
  await lab.advance(61_000);
  expect((await lab.view(runId)).state).toBe('finished');
});

test('the worker thread gives the same rehearsal as the thread of the tests', async () => {
  const protocolId = await lab.issue(quickProtocol());
  const ask = async () => {
    const asked = await lab
      .as('operator', 'POST', `/labs/${demoIds.lab}/rehearsals`)
      .send({ rigId: demoIds.rig, protocolId, revision: 1, seed: 5 })
      .expect(202);
    await lab.services.idle();
    await lab.advance(31_000);
    const samples = await lab.as('viewer', 'GET', `${runs}/${asked.body.id as string}/samples?points=4000`).expect(200);
    return { total: samples.body.total as number, value: samples.body.value as number[] };
  };
  const here = await ask();
  const { world } = lab;
  await lab.stop();
  lab = await LabServer.start(database(), { world, overrides: { tasks: undefined } });
  const there = await ask();
  expect(here.total).toBeGreaterThan(500);
  expect(there).toEqual(here);
});

describe('an arm', () => {
  const armOf = async () => (await lab.as('viewer', 'GET', `/labs/${demoIds.lab}/rigs/${demoIds.rig}`)).body.arm as { name: string } | null;

  test('outlives a restart of the server while the controller goes on', async () => {
    await lab.arm();
    await restart(8_000);
    await lab.advance(3_000);
    expect(await armOf()).not.toBeNull();
  });

  test('does not outlive a door that was opened and closed while no server listened', async () => {
    await lab.arm();
    const { world } = lab;
    await lab.stop();
    await world.clock.advance(60_000);
    world.controller(demoIds.rig).openInterlock();
    await world.clock.advance(30_000);
    world.controller(demoIds.rig).closeInterlock();
    await world.clock.advance(60_000);
    lab = await LabServer.start(database(), { world });
    await lab.advance(3_000);
    expect(lab.station().link.controller()).toMatchObject({ interlockClosed: true, armKey: true });
    expect(await armOf()).toBeNull();
    const { body } = await lab.as('owner', 'GET', `/labs/${demoIds.lab}/audit`).expect(200);
    expect((body.items as { data: { why?: string } }[]).map(({ data }) => data.why)).toContain(
      'the interlock was opened while no server listened',
    );
  });

  test('does not outlive a restart of the controller that no server heard', async () => {
    await lab.arm();
    const { world } = lab;
    await lab.stop();
    world.controller(demoIds.rig).reset();
    await world.clock.advance(8_000);
    lab = await LabServer.start(database(), { world });
    await lab.advance(3_000);
    expect(lab.station().link.health().condition).toBe('ready');
    expect(await armOf()).toBeNull();
  });
});
