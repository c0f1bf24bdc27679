import { demoIds, demoPeople } from '@/db/demo/seed';
import type { Step } from '@/shared/protocol/document';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol } from '@/tests/support/lab-server';

const database = databaseOfThisFile();
let lab: LabServer;
beforeAll(async () => {
  lab = await LabServer.start(database());
}, 60_000);
afterAll(() => lab.stop());
jest.setTimeout(30_000);
const runs = `/labs/${demoIds.lab}/runs`;

describe('a start', () => {
  test('needs a review: its token counts once, for what was reviewed, for 30 s', async () => {
    const protocolId = await lab.issue(quickProtocol());
    await lab.arm();
    const choice = { protocolId, revision: 1, massSetId: demoIds.massSet };
    const review = (who: 'operator' | 'keeper' = 'operator') =>
      lab.as(who, 'POST', `/labs/${demoIds.lab}/rigs/${demoIds.rig}/start-review`).send(choice).expect(201);
    const first = (await review()).body as { token: string; expiresAt: string };
    expect((Date.parse(first.expiresAt) - lab.clock.utcMs()) / 1000).toBeCloseTo(30, 1);
    await lab.advance(31_000);
    expect((await lab.askStart(protocolId, { reviewToken: first.token }).expect(409)).body.code).toBe('not-reviewed');
    // Another person's review, and one of another choice, count for nothing.
    const others = (await review('keeper')).body.token as string;
    expect((await lab.askStart(protocolId, { reviewToken: others }).expect(409)).body.detail).toContain('not what was asked for');
    const another = lab.startToken(await lab.issue(quickProtocol({ name: 'Another' })));
    expect((await lab.askStart(protocolId, { reviewToken: another }).expect(409)).body.code).toBe('not-reviewed');
    const token = (await review()).body.token as string;
    const runId = (await lab.askStart(protocolId, { reviewToken: token }).expect(201)).body.id as string;
    expect((await lab.askStart(protocolId, { reviewToken: token }).expect(409)).body.code).toBe('not-reviewed');
    expect((await lab.askStart(protocolId, { reviewToken: undefined }).expect(400)).body.errors[0].path).toBe('reviewToken');
    await lab.intervene(runId, 'stop').expect(202);
    await lab.until(runId, 'stopped');
  });
});

test('a run of a shuffled protocol begins with the order that was looked at before the start, and the next run draws anew', async () => {
  const block = (to: string) =>
    ({
      kind: 'repeat',
      times: 1,
      steps: [
        { kind: 'swing', to },
        { kind: 'dwell', for_s: 20 },
      ],
    }) as Step;
  const blocks: Step = { kind: 'repeat', times: 1, order: 'shuffled', steps: ['near', 'far', 'clear'].map(block) };
  const protocolId = await lab.issue(quickProtocol({ name: 'Shuffled', steps: [{ kind: 'home' }, blocks] }));
  await lab.arm();
  const seeds = lab.services.startSeeds;
  const query = { protocolId, revision: 1 };
  await lab.as('operator', 'GET', `/labs/${demoIds.lab}/rigs/${demoIds.rig}/start-checks`).query(query).expect(200);
  const looked = seeds.of(demoIds.rig);
  await lab.advance(29_000);
  const runId = (await lab.askStart(protocolId).expect(201)).body.id as string;
  expect((await lab.view(runId)).shuffleSeed).toBe(looked);
  expect(seeds.of(demoIds.rig)).not.toBe(looked);
  await lab.intervene(runId, 'stop').expect(202);
  await lab.until(runId, 'stopped');
});

describe('a resume', () => {
  test('of a run that was disarmed needs somebody on site who arms the rig again, and a review that tells what is left', async () => {
    const runId = await lab.run(quickProtocol());
    await lab.advance(3_600_000, () => lab.services.supervisor.driverOf(runId)?.facts().current?.kind === 'dwell');
    await lab.intervene(runId, 'hold').expect(202);
    await lab.until(runId, 'held');
    await lab.as('operator', 'DELETE', `/labs/${demoIds.lab}/rigs/${demoIds.rig}/arm`).expect(204);
    expect((await lab.intervene(runId, 'resume').expect(409)).body.code).toBe('not-armed');
    await lab.arm();
    const review = await lab.as('operator', 'POST', `${runs}/${runId}/resume-review`).expect(201);
    // The first dwell of 30 s is begun anew, then a swing and the second one.
    expect(review.body.dwellsLeft).toBe(2);
    expect(review.body.firstMove).toBe('swing to far (−20.18°)');
    // No dwell is done yet; two dwells of this rig and length leave what the planner says of them.
    expect(review.body.plannedU).toEqual({ soFar: null, atEnd: expect.any(Number) });
    const leftS = (Date.parse(review.body.finishAt) - lab.clock.utcMs()) / 1000;
    expect(leftS).toBeGreaterThan(60);
    expect(leftS).toBeLessThan(120);
    await lab.intervene(runId, 'resume').expect(202);
    await lab.until(runId, 'finished');
    expect(Math.abs(Date.parse((await lab.view(runId)).endedAt ?? '') - Date.parse(review.body.finishAt))).toBeLessThan(2_000);
  });
});

describe('a skip', () => {
  const reachDwell = async () => {
    const runId = await lab.run(quickProtocol());
    await lab.advance(3_600_000, () => lab.services.supervisor.driverOf(runId)?.facts().current?.kind === 'dwell');
    const { seq } = (await lab.view(runId)).maySkip as { seq: number };
    return { runId, seq };
  };
  const review = (runId: string, seq: number) => lab.as('operator', 'POST', `${runs}/${runId}/skip-review`).send({ seq });
  const skip = (runId: string, body: { seq: number; reviewToken: string }) =>
    lab.as('operator', 'POST', `${runs}/${runId}/skip`).send({ tappedAt: lab.nowIso(), ...body });

  test('tells what it leaves out and breaks, counts once for that very step, and is audited', async () => {
    const { runId, seq } = await reachDwell();
    const { body } = await review(runId, seq).expect(201);
    expect(body).toMatchObject({
      seq,
      kind: 'dwell',
      station: 'near',
      notGoodPath: null,
      dwellsLeft: 1,
      firstMove: 'swing to far (−20.18°)',
    });
    expect(body.leftS).toBeGreaterThan(25);
    expect((await review(runId, seq + 1).expect(409)).body.detail).toContain('is over');
    // A review of a resume or of another step is none of this one.
    const resumes = lab.services.reviews.issue({
      userId: demoPeople.find(({ role }) => role === 'operator')?.id ?? '',
      rigId: demoIds.rig,
      subject: `resume ${runId}`,
    }).token;
    expect((await skip(runId, { seq, reviewToken: resumes }).expect(409)).body.code).toBe('not-reviewed');
    await skip(runId, { seq, reviewToken: body.token }).expect(202);
    expect((await skip(runId, { seq, reviewToken: body.token }).expect(409)).body.code).toBe('not-reviewed');
    const view = await lab.until(runId, 'finished');
    expect(Math.abs(Date.parse(view.endedAt ?? '') - Date.parse(body.finishAt))).toBeLessThan(2_000);
    const { items } = (await lab.as('viewer', 'GET', `${runs}/${runId}/steps`).expect(200)).body;
    const dwells = items.filter(({ kind }: { kind: string }) => kind === 'dwell');
    expect(dwells.map(({ outcome, good }: { outcome: string; good: boolean }) => [outcome, good])).toEqual([
      ['skipped', false],
      ['done', false],
    ]);
    const audit = await lab.as('owner', 'GET', `/labs/${demoIds.lab}/audit`).expect(200);
    expect(audit.body.items).toContainEqual(expect.objectContaining({ kind: 'run.step-skipped', who: 'Ilse Marrowby' }));
  });

  test('of a tap that is older than 5 s moves nothing', async () => {
    const { runId, seq } = await reachDwell();
    const { body } = await review(runId, seq).expect(201);
    const tappedAt = new Date(lab.clock.utcMs() - 6_000).toISOString();
    const late = await lab.as('operator', 'POST', `${runs}/${runId}/skip`).send({ tappedAt, seq, reviewToken: body.token }).expect(409);
    expect(late.body.detail).toContain('it counts for 5 s');
    expect((await lab.view(runId)).current).toMatchObject({ seq, outcome: null });
    await lab.intervene(runId, 'stop').expect(202);
    await lab.until(runId, 'stopped');
  });
});

test('a hold after this dwell is withdrawn by who may resume, and not by a viewer', async () => {
  const runId = await lab.run(quickProtocol());
  await lab.advance(3_600_000, () => lab.services.supervisor.driverOf(runId)?.facts().current?.kind === 'dwell');
  await lab.intervene(runId, 'hold-after-dwell', { who: 'viewer' }).expect(202);
  await lab.services.idle();
  const withdraw = (who: 'viewer' | 'operator') => lab.as(who, 'POST', `${runs}/${runId}/withdraw-hold`).send({ tappedAt: lab.nowIso() });
  await withdraw('viewer').expect(403);
  await withdraw('operator').expect(202);
  expect(await lab.view(runId)).toMatchObject({ holdAfterDwell: false, intervention: { kind: 'hold-withdrawn', by: 'Ilse Marrowby' } });
  await lab.until(runId, 'finished');
});
