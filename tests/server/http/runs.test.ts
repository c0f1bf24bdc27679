import { demoIds } from '@/db/demo/seed';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer } from '@/tests/support/lab-server';

const database = databaseOfThisFile();
let lab: LabServer;

beforeAll(async () => {
  lab = await LabServer.start(database());
}, 60_000);
afterAll(() => lab.stop());

const runs = `/labs/${demoIds.lab}/runs`;

test('a run goes from start to finish', async () => {
  const answer = await lab.as('operator', 'GET', `/labs/${demoIds.lab}/rigs/${demoIds.rig}/start-checks?protocolId=${demoIds.shortProtocol}&revision=1`);
  await lab.arm();
  const t0 = Date.now();
  const started = await lab.as('operator', 'POST', runs).send({ rigId: demoIds.rig, protocolId: demoIds.shortProtocol, revision: 1, massSetId: demoIds.massSet });
  console.log(started.status, JSON.stringify(started.body));
  let n = 0; const s = (lab.clock as any).settle; (lab.clock as any).settle = async () => { n += 1; await s(); }; await lab.advance(600_000); console.log("settles", n);
  console.log('600 s took', Date.now() - t0);
  const view = await lab.as('viewer', 'GET', `${runs}/${started.body.id}`);
  console.log(JSON.stringify({ ...view.body, rig: 0, protocol: 0 }));
}, 120_000);
