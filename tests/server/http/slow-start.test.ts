import { demoIds } from '@/db/demo/seed';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol } from '@/tests/support/lab-server';

const database = databaseOfThisFile();
let lab: LabServer;
beforeAll(async () => {
  lab = await LabServer.start(database());
}, 60_000);
afterAll(() => lab.stop());

test('a start that the database took too long to store moves nothing: the tap no longer counts', async () => {
  const protocolId = await lab.issue(quickProtocol());
  await lab.sign();
  await lab.arm();
  const { pool } = lab.services.database;
  const other = await pool.connect();
  await other.query('begin; lock table runs in share mode');
  const asked = lab.askStart(protocolId).then((answer) => answer);
  const held = "select 1 from pg_locks where relation = 'runs'::regclass and not granted";
  while ((await other.query(held)).rowCount === 0) await new Promise((resolve) => void setImmediate(resolve));
  await lab.advance(5_500);
  await other.query('commit');
  other.release();
  const late = await asked;
  expect(late.status).toBe(409);
  expect(late.body.detail).toMatch(/The tap to start was made \d+ s ago; it counts for 5 s\. Nothing was moved\./);
  expect(lab.services.supervisor.activeOf(demoIds.rig)).toBeNull();
  expect((await lab.as('viewer', 'GET', `/labs/${demoIds.lab}/runs?active=true`)).body.items).toEqual([]);
});
