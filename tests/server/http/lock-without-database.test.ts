import { demoIds } from '@/db/demo/seed';
import type { RigView } from '@/shared/contracts/rigs';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer } from '@/tests/support/lab-server';
import { withoutDatabase } from '@/tests/support/without-database';

/** A personal lock is as robust as hold: it is set out of the server's memory while the database is away, and stored when it is back. */

jest.setTimeout(60_000);
const database = databaseOfThisFile();
let lab: LabServer;
beforeAll(async () => {
  lab = await LabServer.start(database());
}, 60_000);
afterAll(() => lab.stop());

const rig = `/labs/${demoIds.lab}/rigs/${demoIds.rig}`;
const view = async () => (await lab.as('viewer', 'GET', rig).expect(200)).body as RigView;
const set = (key: string) => lab.as('keeper', 'POST', `${rig}/locks`).set('Idempotency-Key', key).send({});
const lift = (lockId: string) => lab.as('keeper', 'POST', `${rig}/locks/${lockId}/lift`).send({ handsOut: true });

test('no run, no database: the arm is void at once, a repeat is the same lock, and both are stored when it is back', async () => {
  await lab.arm(2);
  expect((await view()).locks).toEqual([]);
  let lockId = '';
  await withoutDatabase(lab, async () => {
    // The first is asked before anybody has noticed that the database is away.
    lockId = (await set('hands-in').expect(201)).body.id as string;
    await lab.advance(20_000);
    expect((await set('hands-in').expect(201)).body.id).toBe(lockId);
    expect((await set('hands-in-again').expect(201)).body.id).toBe(lockId);
    expect(lab.services.locks.lockedBy(demoIds.rig)).toContain('Casimir Thornquist has hands in the rig');
    expect(lab.services.arms.armOf(demoIds.rig)).toBeNull();
    // To lift one is not the safe direction: it waits for the database.
    await lab.turnKey();
    expect((await lift(lockId).expect(503)).body.code).toBe('database-away');
    // Who may not lock a rig may not without a database either.
    await lab.as('viewer', 'POST', `${rig}/locks`).send({}).expect(403);
  });
  await lab.advance(6_000);
  await lab.services.idle();
  expect(await view()).toMatchObject({ arm: null, locks: [{ id: lockId, name: 'Casimir Thornquist' }] });
  const { items } = (await lab.as('owner', 'GET', `/labs/${demoIds.lab}/audit`).expect(200)).body as {
    items: { kind: string; data: object }[];
  };
  expect(items.filter(({ kind }) => kind === 'rig.lock-set')).toMatchObject([{ data: { lockId } }]);
  expect(items.filter(({ kind }) => kind === 'rig.arm-ended')).toHaveLength(1);
  await lab.turnKey();
  await lift(lockId).expect(204);
});
