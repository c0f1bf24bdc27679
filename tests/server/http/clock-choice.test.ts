import { demoIds } from '@/db/demo/seed';
import { evaluationViewSchema } from '@/shared/contracts/evaluations';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer } from '@/tests/support/lab-server';

/** What becomes of the channel's clock when somebody decides about it. */

jest.setTimeout(120_000);

const database = databaseOfThisFile();
let lab: LabServer;
beforeAll(async () => {
  lab = await LabServer.start(database());
}, 60_000);
afterAll(() => lab.stop());

const labPath = `/labs/${demoIds.lab}`;
/** Lets the queued job be done. */
const worked = async () => {
  await lab.services.idle();
  await lab.advance(31_000);
};

test('what somebody decides about the clock of the channel is done, told as a difference from the registered evaluation, and refused where it is none', async () => {
  const asked = await lab
    .as('operator', 'POST', `${labPath}/rehearsals`)
    .send({ rigId: demoIds.rig, protocolId: demoIds.shortProtocol, revision: 1, seed: 5 })
    .expect(202);
  await worked();
  const runId = asked.body.id as string;
  const ask = (body: object) => lab.as('analyst', 'POST', `${labPath}/runs/${runId}/evaluations`).send(body);
  const queued = await ask({ clock: { kind: 'left' } }).expect(202);
  await ask({ clock: { kind: 'set', offset_s: 100_000 } }).expect(400);
  await worked();
  const left = evaluationViewSchema.parse(
    (await lab.as('viewer', 'GET', `${labPath}/evaluations/${queued.body.id as string}`).expect(200)).body,
  );
  expect(left.result?.alignment).toMatchObject({ applied: false, decided: { kind: 'left' } });
  expect(left.result?.registered).toBe(false);
  expect(left.result?.warnings).toContainEqual({
    code: 'not-as-registered',
    message: expect.stringContaining('clock of the channel left as it is'),
  });
});
