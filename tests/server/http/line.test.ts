import { eq } from 'drizzle-orm';
import { demoIds } from '@/db/demo/seed';
import { rigLeases } from '@/db/schema';
import { createLink } from '@/server/links/link-driver';
import { lineMessageSchema, type LineMessage } from '@/shared/contracts/link';
import type { Role } from '@/shared/contracts/roles';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigMotion } from '@/shared/rig/document';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol } from '@/tests/support/lab-server';
import { LiveReader } from '@/tests/support/live-reader';

const database = databaseOfThisFile();
let lab: LabServer;
let address: string;
beforeAll(async () => {
  lab = await LabServer.start(database());
  address = await lab.built.listen();
}, 60_000);
afterAll(() => lab.stop());

const rig = `/labs/${demoIds.lab}/rigs/${demoIds.rig}`;
const post = (path: string, body: object, who: Role = 'keeper') => lab.as(who, 'POST', `${rig}${path}`).send(body);
const turntable = () => lab.world.controller(demoIds.rig);
const angle = () => turntable().trueAngleDegAt(lab.clock.utcMs());
const audit = async () =>
  (await lab.as('owner', 'GET', `/labs/${demoIds.lab}/audit`).expect(200)).body.items as { kind: string; data: unknown }[];
const etag = async () => (await lab.as('keeper', 'GET', rig).expect(200)).headers.etag as string;

/** Time goes by with the page of the guided move open. */
async function stay(guidedId: string, seconds: number): Promise<void> {
  for (let step = 0; step < seconds; step += 1) {
    await post('/guided/stay', { guidedId, beat: lab.clock.monotonicMs() }).expect(204);
    await lab.advance(1_000);
  }
  await post('/guided/stay', { guidedId, beat: lab.clock.monotonicMs() }).expect(204);
}

async function begin(): Promise<string> {
  await lab.arm(4);
  return (await post('/guided', { atTheRig: true }).expect(201)).body.id as string;
}
const end = (guidedId: string) => post('/guided/end', { guidedId }).expect(204);

jest.setTimeout(30_000);

describe('a guided first move', () => {
  test('needs the cautions, the arm and the arm key', async () => {
    expect((await post('/guided', {}).expect(400)).body.errors[0].path).toBe('atTheRig');
    expect((await post('/guided', { atTheRig: true }).expect(409)).body.code).toBe('not-signed');
    await lab.sign();
    expect((await post('/guided', { atTheRig: true }).expect(409)).body).toMatchObject({
      code: 'not-armed',
      detail: expect.stringContaining('North bench is not armed'),
    });
    await lab.arm(4);
    turntable().turnArmKey(false);
    await lab.advance(1_000);
    // The key that is turned off is the end of the arm.
    expect((await post('/guided', { atTheRig: true }).expect(409)).body.code).toBe('not-armed');
    turntable().turnArmKey(true);
    await lab.advance(1_000);
  });

  test('turns the table by what was asked, says so in the audit chain, and acts once for a key', async () => {
    const guidedId = await begin();
    const key = 'a-nudge-of-forty-steps';
    const tappedAt = lab.nowIso();
    const nudge = () => post('/guided/nudge', { tappedAt, guidedId, steps: 40 }).set('Idempotency-Key', key);
    const first = await nudge().expect(202);
    expect(first.body).toMatchObject({ order: { kind: 'nudge', steps: 40 }, by: { name: 'Casimir Thornquist' }, present: true });
    await stay(guidedId, 5);
    expect((await nudge().expect(202)).body).toEqual(first.body);
    await stay(guidedId, 5);
    expect(angle()).toBeCloseTo(40 / (16_000 / 360), 6);
    expect((await audit()).slice(0, 2)).toMatchObject([
      { kind: 'rig.nudge-asked', data: { steps: 40, rigId: demoIds.rig } },
      { kind: 'rig.guided-begun', data: { guidedId, arm: 'Ilse Marrowby' } },
    ]);
    await end(guidedId);
  });

  test('refuses what is no nudge with the field and what would be right, and an old tap', async () => {
    const guidedId = await begin();
    const long = await post('/guided/nudge', { tappedAt: lab.nowIso(), guidedId, steps: 5000 }).expect(400);
    expect(long.body).toMatchObject({
      code: 'invalid-input',
      errors: [{ path: 'steps', message: expect.stringContaining('from 1 to 433') }],
    });
    await post('/guided/nudge', { tappedAt: lab.nowIso(), guidedId, steps: 0.5 }).expect(400);
    const tappedAt = new Date(lab.clock.utcMs() - 6_000).toISOString();
    expect((await post('/guided/nudge', { guidedId, steps: 5, tappedAt }).expect(409)).body.detail).toContain('Nothing was moved');
    await end(guidedId);
    expect((await post('/guided/nudge', { tappedAt: lab.nowIso(), guidedId, steps: 5 }).expect(409)).body.detail).toContain('has ended');
  });

  test('and a run keep off each other', async () => {
    const protocolId = await lab.issue(quickProtocol());
    const guidedId = await begin();
    const refused = await lab.askStart(protocolId).expect(409);
    expect(refused.body).toMatchObject({
      code: 'rig-busy',
      detail: expect.stringContaining('Casimir Thornquist is at the guided first move'),
    });
    expect(
      (
        await lab
          .as('keeper', 'PUT', `${rig}/link`)
          .set('If-Match', await etag())
          .send({ kind: 'simulated' })
          .expect(409)
      ).body.code,
    ).toBe('rig-busy');
    await end(guidedId);
    const run = await lab.askStart(protocolId).expect(201);
    await lab.advance(1_000);
    expect((await post('/guided', { atTheRig: true }).expect(409)).body.code).toBe('rig-busy');
    // hold and stop of the rig reach its run
    await post('/hold', {}, 'viewer').expect(202);
    await lab.until(run.body.id as string, 'held');
    await post('/stop', {}, 'viewer').expect(202);
    await lab.until(run.body.id as string, 'stopped');
    expect((await lab.as('viewer', 'GET', rig)).body.arm).toBeNull();
  });

  test('is held by any member', async () => {
    const guidedId = await begin();
    await post('/guided/nudge', { tappedAt: lab.nowIso(), guidedId, steps: 400 }).expect(202);
    await stay(guidedId, 2);
    const before = angle();
    await post('/hold', {}, 'viewer').expect(202);
    await stay(guidedId, 2);
    const held = angle();
    expect(held).toBeGreaterThan(before);
    await stay(guidedId, 2);
    expect(angle()).toBe(held);
    await end(guidedId);
  });

  test('writes the limits of the rig document to the controller', async () => {
    const { body: before } = await lab.as('keeper', 'GET', rig).expect(200);
    const tag = await etag();
    const guidedId = await begin();
    const document = { ...before.document, motion: { ...before.document.motion, minDeg: -170, maxDeg: 170 } };
    await lab
      .as('keeper', 'PUT', `${rig}/document`)
      .set('If-Match', tag)
      .send({ name: before.name, document, reason: 'Taught by hand' })
      .expect(200);
    await lab.advance(3_000);
    await stay(guidedId, 1);
    expect((await post('/guided/teach', { tappedAt: lab.nowIso(), guidedId }).set('If-Match', tag).expect(412)).body.code).toBe(
      'edited-meanwhile',
    );
    const answer = post('/guided/teach', { tappedAt: lab.nowIso(), guidedId })
      .set('If-Match', await etag())
      .then(({ body, status }) => ({ body: body as { limits: unknown }, status }));
    for (let turn = 0; turn < 20; turn += 1) {
      await new Promise<void>((resolve) => void setTimeout(resolve, 5));
      await lab.advance(100);
    }
    const { body, status } = await answer;
    expect({ status, body }).toMatchObject({
      status: 200,
      body: { limits: { minDeg: expect.closeTo(-170, 1), maxDeg: expect.closeTo(170, 1) } },
    });
    expect((await audit())[0]).toMatchObject({ kind: 'rig.limits-taught', data: { revision: 2 } });
    await lab.as('operator', 'POST', `${rig}/guided/teach`).set('If-Match', tag).send({ guidedId }).expect(403);
    await stay(guidedId, 0);
    await end(guidedId);
  });
});

describe('the line', () => {
  test('is chosen on the line that was looked at', async () => {
    await lab.as('keeper', 'PUT', `${rig}/link`).send({ kind: 'simulated' }).expect(428);
    const old = await lab.as('keeper', 'PUT', `${rig}/link`).set('If-Match', '"2-another"').send({ kind: 'simulated' }).expect(412);
    expect(old.body.detail).toContain('another line for North bench');
    await lab
      .as('keeper', 'PUT', `${rig}/link`)
      .set('If-Match', await etag())
      .send({ kind: 'simulated' })
      .expect(200);
  });

  test('streams its health and inputs twice a second, and at once when an input changes', async () => {
    const reader = await LiveReader.open(`${address}/api${rig}/line/live`, { cookie: lab.cookie('viewer') });
    const last = () => lineMessageSchema.parse(reader.events.at(-1)?.data) as LineMessage;
    await lab.advance(4_000);
    await reader.until(() => reader.events.length >= 8);
    expect(last()).toMatchObject({
      health: { condition: 'ready', discardedLines: 0 },
      controller: { interlockClosed: true, supplyPresent: true, armKey: true, positionKnown: true },
      limits: { minDeg: expect.any(Number) },
      guided: null,
    });
    const count = reader.events.length;
    turntable().turnArmKey(false);
    await lab.advance(50);
    await reader.until(() => reader.events.length > count);
    expect(last().controller?.armKey).toBe(false);
    turntable().turnArmKey(true);
    reader.close();
  });
});

describe('a controller that obeys another server', () => {
  const rivalsNumber = 4_000;

  async function drivenByARival(): Promise<void> {
    const rival = createLink({ factory: turntable().factory, clock: lab.clock, rig: demoRigWide.motion as RigMotion, epoch: rivalsNumber });
    lab.world.controller(demoIds.rig).unplug();
    await lab.advance(1_000);
    lab.world.controller(demoIds.rig).plug();
    rival.open();
    await lab.advance(1_000);
    await rival.close();
    await lab.advance(10_000);
  }
  const health = () => lab.built.services.stations.get(demoIds.rig)?.link.health();

  test('is kept from this one until a keeper, who knows that the other one is gone, takes it over for good', async () => {
    await post('/line/take-over', { keptOutBy: rivalsNumber }).expect(409);
    await drivenByARival();
    expect(health()).toMatchObject({
      condition: 'refused',
      higherEpoch: rivalsNumber,
      detail: expect.stringContaining('take the controller over'),
    });
    expect((await post('/line/take-over', { keptOutBy: rivalsNumber - 1 }).expect(409)).body.detail).toContain(
      `obeys number ${rivalsNumber} now`,
    );
    expect((await post('/line/take-over', { keptOutBy: rivalsNumber }).expect(202)).body).toEqual({ number: rivalsNumber + 1 });
    await lab.advance(10_000);
    expect(health()).toMatchObject({ condition: 'ready', higherEpoch: null });
    expect((await audit())[0]).toMatchObject({ kind: 'rig.controller-taken-over', data: { keptOutBy: rivalsNumber } });
    // The number is the lease's: the next process goes on above it.
    const [row] = await lab.database.connection.db
      .select({ epoch: rigLeases.epoch })
      .from(rigLeases)
      .where(eq(rigLeases.rigId, demoIds.rig));
    expect(row?.epoch).toBe(rivalsNumber + 1);
  });
});
