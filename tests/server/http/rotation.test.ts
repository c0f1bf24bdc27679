import { demoIds } from '@/db/demo/seed';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer } from '@/tests/support/lab-server';

/** A rotation through the whole server: what a start needs, a hold in mid-turn, the review of what is left, and the way back. */

const database = databaseOfThisFile();
let lab: LabServer;
beforeAll(async () => {
  lab = await LabServer.start(database());
}, 60_000);
afterAll(() => lab.stop());
jest.setTimeout(60_000);

const rig = `/labs/${demoIds.lab}/rigs/${demoIds.rig}`;
const runs = `/labs/${demoIds.lab}/runs`;
const turning: ProtocolDocument = {
  formatVersion: 1,
  name: 'A turn',
  steps: [{ kind: 'home' }, { kind: 'rotate', period_s: 60, turns: 1 }, { kind: 'dwell', for_s: 30 }],
};
type Check = { code: string; state: string; detail: string };
const checkOf = async (protocolId: string, code: string) => {
  const { body } = await lab.as('operator', 'GET', `${rig}/start-checks?protocolId=${protocolId}&revision=1`).expect(200);
  return (body.checks as Check[]).find((check) => check.code === code);
};

test('is issued only for a rig whose cables stand it', async () => {
  const made = await lab.as('operator', 'POST', `/labs/${demoIds.lab}/protocols`).send({ document: turning }).expect(201);
  const answer = await lab
    .as('operator', 'POST', `/labs/${demoIds.lab}/protocols/${made.body.id}/revisions`)
    .set('If-Match', made.headers.etag as string)
    .send({ rigId: demoIds.rig })
    .expect(422);
  expect(answer.body.errors).toMatchObject([{ path: '2.rotate', code: 'turns-limit' }]);
});

test('starts only where the controller was taught the turns, is held in mid-turn, and turns back', async () => {
  const { headers } = await lab.as('keeper', 'GET', rig).expect(200);
  await lab
    .as('keeper', 'PUT', `${rig}/document`)
    .set('If-Match', headers.etag as string)
    .send({ name: 'North bench', document: { ...demoRigWide, motion: { ...demoRigWide.motion, turnsLimit: 2 } }, reason: 'Slip ring' })
    .expect(200);
  await lab.advance(5_000);
  const protocolId = await lab.issue({ ...turning, name: 'A turn with a slip ring' });
  await lab.arm();
  expect(await checkOf(protocolId, 'protocol')).toMatchObject({
    state: 'fail',
    detail: expect.stringMatching(
      /^Step 2\.rotate: The rotation turns from 0° to 360°, but the controller keeps within −175\.005° to 175\.005°/,
    ),
  });
  const refused = await lab.askStart(protocolId);
  expect(refused.status).toBeGreaterThanOrEqual(400);
  expect(JSON.stringify(refused.body)).toContain('Write the limits of the rig');

  const lesson = lab
    .station()
    .link.teach({ leastDeg: -895, greatestDeg: 895, maxSpeedDegS: 6, maxAccelerationDegS2: 2, homeSpeedDegS: 0.6 });
  await lab.advance(2_000);
  expect(await lesson).toMatchObject({ taught: true });
  expect(await checkOf(protocolId, 'protocol')).toMatchObject({ state: 'pass' });
  expect(await checkOf(protocolId, 'travel')).toMatchObject({ state: 'pass' });

  const runId = (await lab.askStart(protocolId).expect(201)).body.id as string;
  await lab.advance(40_000);
  await lab.intervene(runId, 'hold').expect(202);
  const { reason } = await lab.until(runId, 'held');
  expect(reason).toMatch(/turns from where the rotation began\. Resumed, it goes on and turns back at its end\.$/);
  const review = await lab.as('operator', 'POST', `${runs}/${runId}/resume-review`).expect(201);
  expect(review.body.firstMove).toMatch(/^rotate: a turn counter-clockwise in 1\smin( 0\ss)?, then back again$/);
  await lab.intervene(runId, 'resume').expect(202);
  await lab.until(runId, 'finished');
  const { body } = await lab.as('viewer', 'GET', `${runs}/${runId}/steps`).expect(200);
  expect((body.items as { path: string; outcome: string }[]).map(({ path, outcome }) => `${path} ${outcome}`)).toEqual([
    '1.home done',
    '2.rotate.a cut short',
    '2.rotate.a late',
    '2.rotate.b done',
    '3.dwell done',
  ]);
});
