import { demoIds } from '@/db/demo/seed';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer } from '@/tests/support/lab-server';

const database = databaseOfThisFile();
const gib = 2 ** 30;
let free: number | null = 40 * gib;
let lab: LabServer;
beforeAll(async () => {
  lab = await LabServer.start(database(), { overrides: { freeBytes: () => Promise.resolve(free) } });
}, 60_000);
afterAll(() => lab.stop());

const rigs = `/labs/${demoIds.lab}/rigs`;
const rig = `${rigs}/${demoIds.rig}`;
const auditKinds = async () =>
  (await lab.as('owner', 'GET', `/labs/${demoIds.lab}/audit`).expect(200)).body.items.map(({ kind }: { kind: string }) => kind);

describe('a rig', () => {
  test('shows its line, its turntable and its mass sets', async () => {
    const { body } = await lab.as('viewer', 'GET', rig).expect(200);
    expect(body).toMatchObject({
      name: 'North bench',
      revision: 1,
      link: { kind: 'simulated' },
      arm: null,
      activeRun: null,
      live: {
        condition: 'ready',
        positionKnown: true,
        angleDeg: 0,
        moving: false,
        interlockClosed: true,
        supplyPresent: true,
        discardedLines: 0,
      },
    });
    expect(Math.abs(Date.parse(body.live.lastReplyAt) - lab.clock.utcMs())).toBeLessThan(2000);
    expect(body.massSets.map(({ label }: { label: string }) => label)).toEqual(['Lead spheres, 1.6 kg', 'Empty control']);
  });

  test('gets a new revision; earlier ones stay, and whoever edits an old one is told who was faster', async () => {
    const before = await lab.as('keeper', 'GET', rig).expect(200);
    const revise = (etag: string, reason: string) =>
      lab
        .as('keeper', 'PUT', `${rig}/document`)
        .set('If-Match', etag)
        .send({ name: 'North bench', document: { ...demoRigWide, noise: { readout_rad: 2e-5 } }, reason });
    const after = await revise(before.headers.etag as string, 'New camera').expect(200);
    expect(after.body).toMatchObject({ revision: 2, document: { noise: { readout_rad: 2e-5 } } });
    const late = await revise(before.headers.etag as string, 'Another camera').expect(412);
    expect(late.body.detail).toContain('Casimir Thornquist made revision 2 of North bench after you opened it ("New camera"');
    const all = await lab.as('viewer', 'GET', `${rig}/revisions`).expect(200);
    expect(all.body.items.map(({ number, reason }: { number: number; reason: string }) => [number, reason])).toEqual([
      [2, 'New camera'],
      [1, 'First measurement of the rig'],
    ]);
    expect(all.body.items[1].document).toEqual(demoRigWide);
    await lab.advance(5_000);
    expect((await lab.as('viewer', 'GET', rig)).body.live.condition).toBe('ready');
  });

  test('is added with its first mass set and a line of its own, which fills a channel', async () => {
    const made = await lab
      .as('keeper', 'POST', rigs)
      .send({ name: 'South bench', document: demoRigWide, link: { kind: 'simulated' } })
      .expect(201);
    expect(made.body.massSets).toHaveLength(1);
    // The lease of a rig that is added to a running server is taken at once.
    await lab.advance(40_000);
    const { body } = await lab.as('viewer', 'GET', `${rigs}/${made.body.id}`).expect(200);
    expect(body.live.condition).toBe('ready');
    const channels = await lab.as('viewer', 'GET', `${rigs}/${made.body.id}/channels`).expect(200);
    expect(channels.body.items).toMatchObject([{ name: 'deflection', unit: 'rad', role: 'deflection', source: 'simulated' }]);
    expect(await auditKinds()).toContain('rig.added');
  });

  test('takes mass sets with labels of their own', async () => {
    const add = (label: string) => lab.as('keeper', 'POST', `${rig}/mass-sets`).send({ label, sources: { shape: 'none' } });
    await add('Bare').expect(201);
    expect((await add('Bare').expect(409)).body.detail).toContain('a mass set called "Bare" already');
    expect(
      (
        await lab
          .as('keeper', 'POST', `${rig}/mass-sets`)
          .send({ label: 'Half', sources: { shape: 'sphere' } })
          .expect(400)
      ).body.errors.map(({ path }: { path: string }) => path),
    ).toEqual(['sources.mass', 'sources.radius', 'sources.orbit']);
  });
});

describe('the line', () => {
  test.each([
    ['http://10.0.0.4', 4001],
    ['rig-lab.example', 0],
    ['', 4001],
  ])('to a network serial server needs an address and a port: not %p, port %d', async (host, port) => {
    const { etag } = (await lab.as('keeper', 'GET', rig)).headers as { etag: string };
    const answer = await lab.as('keeper', 'PUT', `${rig}/link`).set('If-Match', etag).send({ kind: 'tcp', host, port }).expect(400);
    expect(answer.body.errors[0].path).toBe(port === 0 ? 'port' : 'host');
    expect((await lab.as('viewer', 'GET', rig)).body.link).toEqual({ kind: 'simulated' });
  });

  test('that leads nowhere is tried and explained', async () => {
    const answer = lab
      .as('keeper', 'POST', `${rig}/link/try`)
      .send({ kind: 'serial', path: '/tmp/no-turntable-here' })
      .expect(200)
      .then(({ body }) => body as unknown);
    for (let turn = 0; turn < 200; turn += 1) await lab.advance(100);
    expect(await answer).toEqual({ ok: false, detail: expect.stringContaining('There is no port /tmp/no-turntable-here'), firmware: null });
  });
});

describe('start checks', () => {
  const checks = async (query = `protocolId=${demoIds.shortProtocol}&revision=1`) =>
    (await lab.as('operator', 'GET', `${rig}/start-checks?${query}`).expect(200)).body;
  type Told = { code: string; figures: { name: string; value: number | null }[] };
  const stateOf = async (code: string) => (await checks()).checks.find((check: Told) => check.code === code);
  const figureOf = ({ figures }: Told, wanted: string) => figures.find(({ name }) => name === wanted)?.value ?? null;

  test('say what is missing and when the run would finish', async () => {
    await lab.advance(40_000);
    const report = await checks();
    expect(report.mayStart).toBe(false);
    expect(report.checks.filter(({ state }: { state: string }) => state === 'fail').map(({ code }: { code: string }) => code)).toEqual([
      'armed',
      'cautions',
    ]);
    // Home, a swing, a kick of half a period with three periods of ring-down, then 6 × (far, near) at a beat of 2 periods of 420 s, and little more.
    expect(report.durationS).toBeGreaterThan(3.5 * 420 + 12 * 840);
    expect(report.durationS).toBeLessThan(3.5 * 420 + 12 * 840 + 60);
    expect(Date.parse(report.finishAt) - lab.clock.utcMs()).toBeCloseTo(1000 * report.durationS, -2);
    expect(report.firstMove).toContain('home');
  });

  test('want an arm beyond the predicted finish', async () => {
    await lab.arm(1);
    expect(await stateOf('armed')).toMatchObject({ state: 'fail', detail: expect.stringContaining('arm it for longer') });
    await lab.arm(4);
    expect((await checks()).mayStart).toBe(true);
  });

  test('say where a start by hand would leave the hours of the room, and leave the choice to whoever starts', async () => {
    expect(await stateOf('room')).toBeUndefined();
    const hours = (until: string) =>
      lab
        .as('keeper', 'PUT', `${rig}/hours`)
        .send({ nightWindow: { from: '20:00', until }, blackouts: [] })
        .expect(200);
    await hours('23:00');
    expect(await stateOf('room')).toMatchObject({
      state: 'note',
      detail: expect.stringContaining('the night window of the room is 20:00 to 23:00'),
    });
    expect((await checks()).mayStart).toBe(true);
    await hours('07:00');
    expect(await stateOf('room')).toMatchObject({ state: 'pass', detail: expect.stringContaining('within the hours of the room') });
    await lab.as('keeper', 'PUT', `${rig}/hours`).send({ nightWindow: null, blackouts: [] }).expect(200);
  });

  test('notice that the deflection has stopped', async () => {
    await database().connection.pool.query('delete from samples');
    expect(await stateOf('data')).toMatchObject({ state: 'fail', detail: 'The channel deflection has no sample yet.' });
    await lab.advance(40_000);
    expect(await stateOf('data')).toMatchObject({ state: 'note', detail: expect.stringContaining('10 min without a gap') });
    await lab.advance(600_000);
    expect(await stateOf('data')).toMatchObject({ state: 'pass' });
    const { connection } = database();
    await connection.pool.query('delete from samples where at between $1 and $2', [
      new Date(lab.clock.utcMs() - 200_000),
      new Date(lab.clock.utcMs() - 100_000),
    ]);
    const gapped = await stateOf('data');
    expect(gapped).toMatchObject({ state: 'note', detail: expect.stringContaining('had a gap') });
    expect(figureOf(gapped, 'longest gap')).toBeCloseTo(100, 0);
  });

  test('carry what was measured: line, clock, travel, disk, database, arm and motor', async () => {
    const report = await checks();
    const told = new Map(report.checks.map((one: Told) => [one.code, one]));
    expect([...told.keys()].sort()).toEqual(
      'armed cameras cautions clock data database disk free homed interlock link lock protocol soak still supply travel'.split(' '),
    );
    const value = (code: string, name: string) => figureOf(told.get(code) as Told, name) as number;
    expect(value('link', 'last reply')).toBeGreaterThanOrEqual(0);
    expect(value('link', 'last reply')).toBeLessThan(2);
    expect(value('link', 'round trip')).toBeGreaterThanOrEqual(0);
    expect(value('clock', 'u of an instant')).toBeGreaterThan(0);
    // near +20.18 deg in a travel of ±175 deg
    expect(value('travel', 'left')).toBeCloseTo(154.82, 1);
    expect(value('disk', 'free')).toBe(40);
    expect(value('disk', 'need')).toBeGreaterThan(1);
    expect(value('database', 'answer')).toBeGreaterThanOrEqual(0);
    const { armed } = Object.fromEntries(told) as { armed: Told };
    expect(Number(figureOf(armed, 'armed for')) - Number(figureOf(armed, 'to spare'))).toBeCloseTo(report.durationS, 3);
  });

  test('look at the channels that steps wait for', async () => {
    const calm = { kind: 'settle' as const, calmWhen: { amplitude_urad: 20, window_s: 420 } };
    const wait = { kind: 'wait' as const, until: { channel: 'box temperature', below: 24 } };
    const said = async (...steps: ProtocolDocument['steps']) => {
      const protocolId = await lab.issue({ formatVersion: 1, name: 'Waits', steps: [{ kind: 'home' }, ...steps] });
      const report = await checks(`protocolId=${protocolId}&revision=1`);
      return report.checks.find(({ code }: Told) => code === 'waited-channels');
    };
    await lab.advance(2_000);
    expect(await said(calm)).toMatchObject({ state: 'pass', detail: expect.stringContaining('deflection') });
    expect(await said(calm, wait)).toMatchObject({
      state: 'fail',
      detail: expect.stringMatching(
        /^3\.wait would wait in vain .*no device of this rig fills a channel "box temperature"\. There are: deflection\.$/,
      ),
    });
  });

  test('want room on the disk, and say how much is to be made', async () => {
    free = 0.5 * gib;
    expect(await stateOf('disk')).toMatchObject({ state: 'fail', detail: expect.stringMatching(/make room for 0\.5\sGiB/) });
    expect((await checks()).mayStart).toBe(false);
    free = null;
    expect(await stateOf('disk')).toMatchObject({ state: 'note' });
    free = 40 * gib;
  });

  test('say of nothing that it is well while nothing talks at the line', async () => {
    const link = { kind: 'serial', path: '/dev/evenfall-no-such-port', baudRate: 115_200 };
    const made = await lab.as('keeper', 'POST', rigs).send({ name: 'Far bench', document: demoRigWide, link }).expect(201);
    await lab.advance(40_000);
    const query = `protocolId=${demoIds.shortProtocol}&revision=1`;
    const { body } = await lab.as('viewer', 'GET', `${rigs}/${made.body.id}/start-checks?${query}`).expect(200);
    const told = new Map(body.checks.map((one: { code: string; state: string; detail: string }) => [one.code, one]));
    for (const code of ['interlock', 'supply', 'still'])
      expect(told.get(code)).toMatchObject({ state: 'fail', detail: 'Not known: the controller has not answered.' });
    expect(told.get('link')).toMatchObject({ state: 'fail', detail: expect.stringMatching(/^Not ready: .*[^.]\.$/) });
  });

  test('of a revision that is not there', async () => {
    await lab.as('viewer', 'GET', `${rig}/start-checks?protocolId=${demoIds.shortProtocol}&revision=7`).expect(404);
    await lab.as('viewer', 'GET', `${rig}/start-checks?protocolId=${demoIds.shortProtocol}`).expect(400);
  });
});
