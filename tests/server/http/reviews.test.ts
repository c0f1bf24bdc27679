import { demoIds } from '@/db/demo/seed';
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
    const leftS = (Date.parse(review.body.finishAt) - lab.clock.utcMs()) / 1000;
    expect(leftS).toBeGreaterThan(60);
    expect(leftS).toBeLessThan(120);
    await lab.intervene(runId, 'resume').expect(202);
    await lab.until(runId, 'finished');
    expect(Math.abs(Date.parse((await lab.view(runId)).endedAt ?? '') - Date.parse(review.body.finishAt))).toBeLessThan(2_000);
  });
});
