import { demoIds, demoPeople } from '@/db/demo/seed';
import type { RigView } from '@/shared/contracts/rigs';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { cautionsVersion } from '@/shared/rig/cautions';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol } from '@/tests/support/lab-server';

/** Arming, cautions and personal locks by the rule of the product: whatever is asked over the network, a key, a delay and a closed door decide. */

const database = databaseOfThisFile();
let lab: LabServer;
beforeAll(async () => {
  lab = await LabServer.start(database(), { config: { virtualExitDelayS: 120 } });
}, 60_000);
afterAll(() => lab.stop());
jest.setTimeout(30_000);

const rig = `/labs/${demoIds.lab}/rigs/${demoIds.rig}`;
const hour = 3_600_000;
const inHours = (hours: number) => new Date(lab.clock.utcMs() + hours * hour).toISOString();
const view = async () => (await lab.as('viewer', 'GET', rig).expect(200)).body as RigView;
const turntable = () => lab.world.controller(demoIds.rig);
const audit = async () => {
  await lab.services.idle();
  return (await lab.as('owner', 'GET', `/labs/${demoIds.lab}/audit`).expect(200)).body.items as {
    kind: string;
    who: string;
    data: Record<string, unknown>;
  }[];
};

describe('cautions', () => {
  test('are signed per person and rig before arming, in the words that hold now', async () => {
    expect((await lab.askArm().expect(409)).body).toMatchObject({ code: 'not-signed', detail: expect.stringContaining('North bench') });
    const sign = (version: number) => lab.as('operator', 'POST', `${rig}/cautions`).send({ version });
    expect((await sign(cautionsVersion + 1).expect(412)).body.detail).toContain('Read them as they are');
    const signed = await sign(cautionsVersion).expect(201);
    expect(signed.body).toMatchObject({ name: 'Ilse Marrowby', version: cautionsVersion, at: inHours(0) });
    await lab.advance(60_000);
    // The first signature stays.
    expect((await sign(cautionsVersion).expect(201)).body).toEqual(signed.body);
    expect((await view()).signatures).toEqual([signed.body]);
    expect((await audit())[1]).toMatchObject({ kind: 'rig.cautions-signed', data: { textHash: expect.stringMatching(/^[0-9a-f]{64}$/) } });
  });
});

describe('arming', () => {
  test('waits for the key, then for the exit delay of 2 min with the door closed at its end, and names who answers until when', async () => {
    const until = inHours(16);
    const asked = await lab.askArm(16).expect(202);
    // The key is on from before: that says nothing about anybody's presence.
    expect(asked.body).toMatchObject({ name: 'Ilse Marrowby', until, stage: 'key-off' });
    await lab.advance(130_000);
    expect((await view()).arm).toBeNull();
    turntable().turnArmKey(false);
    await lab.advance(200);
    expect((await view()).arming?.stage).toBe('key-on');
    turntable().turnArmKey(true);
    await lab.advance(200);
    const leaving = await view();
    expect(leaving.arming?.stage).toBe('leave');
    expect((Date.parse(leaving.arming?.endsAt ?? '') - lab.clock.utcMs()) / 1000).toBeCloseTo(120, 0);
    // Out through the door, which is closed behind.
    turntable().openInterlock();
    await lab.advance(60_000);
    turntable().closeInterlock();
    await lab.advance(58_000);
    expect((await view()).arm).toBeNull();
    await lab.advance(3_000);
    expect(await view()).toMatchObject({ arm: { name: 'Ilse Marrowby', until }, arming: null, disarmed: null });
    await lab.as('operator', 'DELETE', `${rig}/arm`).expect(204);
    expect(await view()).toMatchObject({ arm: null, disarmed: { name: 'Ilse Marrowby', why: 'disarmed by Ilse Marrowby' } });
    expect((await audit()).slice(0, 3).map(({ kind }) => kind)).toEqual(['rig.arm-ended', 'rig.armed', 'rig.arming-asked']);
  });

  const spoils: [string, string, () => void, () => void][] = [
    ['the door is open at the end', 'the door was not closed', () => turntable().openInterlock(), () => turntable().closeInterlock()],
    ['the key is turned off', 'the arm key was turned off', () => turntable().turnArmKey(false), () => turntable().turnArmKey(true)],
    ['the supply is lost', 'the motor supply was lost', () => turntable().loseSupply(), () => turntable().returnSupply()],
    ['the controller restarts', 'the controller restarted', () => turntable().reset(), () => undefined],
    ['the line is lost', 'the line to the controller was lost', () => turntable().dropLine(10_000), () => undefined],
  ];
  test.each(spoils)('comes to nothing when %s, and says so', async (_what, why, happen, undo) => {
    await lab.askArm(2).expect(202);
    await lab.turnKey();
    await lab.advance(30_000);
    happen();
    await lab.advance(100_000);
    expect(await view()).toMatchObject({ arm: null, arming: null, disarmed: { name: 'Ilse Marrowby', why: expect.stringContaining(why) } });
    expect((await audit()).find(({ kind }) => kind === 'rig.not-armed')).toMatchObject({
      who: 'Ilse Marrowby',
      data: { why: expect.stringContaining(why) },
    });
    undo();
    await lab.advance(5_000);
  });

  test('comes to nothing when nobody turns the key within 10 min, or when it is ended', async () => {
    await lab.askArm(2).expect(202);
    await lab.advance(601_000);
    expect((await view()).disarmed?.why).toBe('the arm key was not turned on within 10 min');
    await lab.askArm(2).expect(202);
    await lab.as('keeper', 'DELETE', `${rig}/arm`).expect(204);
    expect((await view()).disarmed?.why).toBe('Casimir Thornquist ended it before the exit delay was over');
    await lab.as('keeper', 'DELETE', `${rig}/arm`).expect(404);
  });

  test('lasts 72 h at most and ends by itself', async () => {
    expect((await lab.askArm(72.1).expect(400)).body.detail).toContain('more than 72 h ahead');
    expect((await lab.askArm(-1).expect(400)).body.detail).toContain('past');
    await lab.arm(0.05);
    await lab.advance(0.05 * hour);
    expect(await view()).toMatchObject({ arm: null, disarmed: { why: 'its time was over' } });
  });

  test.each([
    { what: 'the interlock opens', happen: () => turntable().openInterlock(), undo: () => turntable().closeInterlock(), word: 'interlock' },
    { what: 'the motor supply is lost', happen: () => turntable().loseSupply(), undo: () => turntable().returnSupply(), word: 'supply' },
    { what: 'the controller restarts', happen: () => turntable().reset(), undo: () => undefined, word: 'controller' },
    { what: 'the key is turned off', happen: () => turntable().turnArmKey(false), undo: () => undefined, word: 'arm key' },
  ])('is void when $what', async ({ happen, undo, word }) => {
    await lab.arm(2);
    happen();
    await lab.advance(10_000);
    expect(await view()).toMatchObject({ arm: null, disarmed: { why: expect.stringContaining(word) } });
    expect((await audit()).find(({ kind }) => kind === 'rig.arm-ended')).toMatchObject({
      who: 'the run engine',
      data: { why: expect.stringContaining(word) },
    });
    undo();
    await lab.advance(5_000);
  });

  test('is not begun while a run is under way; the run is held when the arm is ended, and says why', async () => {
    const runId = await lab.run(quickProtocol());
    await lab.advance(15_000);
    expect((await lab.askArm().expect(409)).body.code).toBe('rig-busy');
    await lab.as('operator', 'DELETE', `${rig}/arm`).expect(204);
    const held = await lab.until(runId, 'held');
    expect(held.reason).toBe('The arm of Ilse Marrowby was ended: disarmed by Ilse Marrowby. Arm the rig again on site, then resume.');
    await lab.arm();
    expect((await lab.view(runId)).mayResume.ok).toBe(true);
    await lab.intervene(runId, 'stop').expect(202);
    await lab.until(runId, 'stopped');
    expect((await view()).disarmed?.why).toBe('the run was stopped');
  });
});

describe('the virtual key and door', () => {
  const turn = (body: object, at = rig) => lab.as('operator', 'POST', `${at}/virtual`).send(body);

  test('arm a rig that is part of the server', async () => {
    await lab.askArm(2).expect(202);
    for (const armKey of ['off', 'on']) {
      await turn({ armKey }).expect(204);
      await lab.advance(200);
    }
    await turn({ door: 'open' }).expect(204);
    await lab.advance(1_000);
    expect((await view()).live).toMatchObject({ armKey: true, interlockClosed: false });
    await turn({ door: 'closed' }).expect(204);
    await lab.advance(121_000);
    expect((await view()).arm?.name).toBe('Ilse Marrowby');
    expect((await audit()).filter(({ kind }) => kind === 'rig.virtual-turned')).toHaveLength(4);
  });

  test('do not exist where the rig is real', async () => {
    const link = { kind: 'serial', path: '/dev/evenfall-no-such-port', baudRate: 115_200 };
    const made = await lab
      .as('keeper', 'POST', `/labs/${demoIds.lab}/rigs`)
      .send({ name: 'Far bench', document: demoRigWide, link })
      .expect(201);
    const refused = await turn({ armKey: 'on' }, `/labs/${demoIds.lab}/rigs/${String(made.body.id)}`).expect(409);
    expect(refused.body.detail).toContain('The arm key and the door of Far bench are real');
  });
});

describe('a personal lock', () => {
  const set = (who: 'keeper' | 'operator' = 'keeper') => lab.as(who, 'POST', `${rig}/locks`).send({});
  const lift = (who: 'owner' | 'keeper' | 'operator', lockId: string) =>
    lab.as(who, 'POST', `${rig}/locks/${lockId}/lift`).send({ handsOut: true });
  const nameOf = (role: string) => demoPeople.find((one) => one.role === role)?.name ?? '';

  test('brings a going motion to rest, ends the arm, and lets nobody start, resume or move until it is lifted', async () => {
    const runId = await lab.run(quickProtocol());
    await lab.advance(3_600_000, () => lab.station().link.controller()?.moving === true);
    const lockId = (await set().expect(201)).body.id as string;
    const held = await lab.until(runId, 'held');
    expect(lab.station().link.controller()?.moving).toBe(false);
    expect(held.reason).toContain('Casimir Thornquist (personal lock)');
    expect(held.mayResume).toEqual({
      ok: false,
      why: 'Casimir Thornquist has hands in the rig (personal lock). Nothing moves until it is lifted at the rig.',
    });
    expect(await view()).toMatchObject({ arm: null, disarmed: { why: 'Casimir Thornquist set a personal lock' }, locks: [{ id: lockId }] });
    expect((await lab.intervene(runId, 'resume').expect(409)).body.code).toBe('locked');
    expect((await lab.askArm().expect(409)).body.code).toBe('locked');
    // Setting one's own again is the same lock.
    expect((await set().expect(201)).body.id).toBe(lockId);
    // A tap could come from anywhere: the key shows that somebody is there, for 2 min and for one lock.
    const afar = await lift('keeper', lockId).expect(409);
    expect(afar.body).toMatchObject({ code: 'not-ready', detail: expect.stringContaining('turn the arm key of') });
    await lab.turnKey();
    await lab.advance(121_000);
    await lift('keeper', lockId).expect(409);
    await lab.turnKey();
    await lift('keeper', lockId).expect(204);
    // The arm stays void: somebody has to be at the rig first.
    expect((await lab.intervene(runId, 'resume').expect(409)).body.code).toBe('not-armed');
    await lab.arm();
    await lab.intervene(runId, 'resume').expect(202);
    await lab.until(runId, 'finished');
  });

  test('of several persons counts until the last is lifted; only its owner lifts one, or an owner of the lab with a reason', async () => {
    const one = (await set('keeper').expect(201)).body.id as string;
    const two = (await set('operator').expect(201)).body.id as string;
    expect((await lift('operator', one).expect(403)).body.detail).toContain(`personal lock of ${nameOf('keeper')}`);
    const override = (who: 'owner' | 'keeper', reason: string) => lab.as(who, 'POST', `${rig}/locks/${one}/override`).send({ reason });
    await override('keeper', 'gone home').expect(403);
    expect((await override('owner', ' ').expect(400)).body.errors[0].path).toBe('reason');
    await override('owner', 'Gone home; I looked into the room myself').expect(204);
    expect((await audit())[0]).toMatchObject({
      kind: 'rig.lock-overridden',
      who: nameOf('owner'),
      data: { of: nameOf('keeper'), reason: 'Gone home; I looked into the room myself' },
    });
    expect((await view()).locks.map(({ name }) => name)).toEqual([nameOf('operator')]);
    expect((await lab.askArm().expect(409)).body).toMatchObject({ code: 'locked', detail: expect.stringContaining(nameOf('operator')) });
    await lab.turnKey();
    const third = (await set('keeper').expect(201)).body.id as string;
    await lift('operator', two).expect(204);
    await lift('operator', two).expect(404);
    expect((await lift('keeper', third).expect(409)).body.code).toBe('not-ready');
    await lab.turnKey();
    await lift('keeper', third).expect(204);
    expect((await audit())[0]).toMatchObject({ kind: 'rig.lock-lifted' });
    await lab.askArm().expect(202);
    await lab.as('operator', 'DELETE', `${rig}/arm`).expect(204);
  });

  test('ends a small move by hand, an arming, and outlives a restart', async () => {
    await lab.arm(2);
    const guidedId = (await lab.as('keeper', 'POST', `${rig}/guided`).send({ atTheRig: true }).expect(201)).body.id as string;
    const stay = () => lab.as('keeper', 'POST', `${rig}/guided/stay`).send({ guidedId, beat: lab.clock.monotonicMs() });
    await stay().expect(204);
    await lab.as('keeper', 'POST', `${rig}/guided/nudge`).send({ tappedAt: lab.nowIso(), guidedId, steps: 400 }).expect(202);
    await lab.advance(1_500);
    expect(lab.station().link.controller()?.moving).toBe(true);
    const lockId = (await set('operator').expect(201)).body.id as string;
    await lab.advance(2_000);
    expect(lab.station().link.controller()?.moving).toBe(false);
    await stay().expect(204);
    const refused = await lab.as('keeper', 'POST', `${rig}/guided/nudge`).send({ tappedAt: lab.nowIso(), guidedId, steps: 4 }).expect(409);
    expect(refused.body.code).toBe('locked');
    const { world } = lab;
    await lab.stop();
    lab = await LabServer.start(database(), { world });
    expect((await view()).locks.map(({ id }) => id)).toEqual([lockId]);
    await lab.turnKey();
    await lift('operator', lockId).expect(204);
    await lab.askArm(2).expect(202);
    const again = (await set('operator').expect(201)).body.id as string;
    expect(await view()).toMatchObject({ arming: null, disarmed: { why: 'Ilse Marrowby set a personal lock' } });
    // A controller that does not answer cannot show that anybody is there, nor one that has restarted since.
    await lab.turnKey();
    lab.world.controller(demoIds.rig).unplug();
    await lab.advance(10_000);
    expect((await lift('operator', again).expect(409)).body.detail).toContain('does not answer');
    lab.world.controller(demoIds.rig).plug();
    await lab.advance(10_000);
    await lift('operator', again).expect(409);
    await lab.turnKey();
    await lift('operator', again).expect(204);
  });
});
