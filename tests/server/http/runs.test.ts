import { unzipSync } from 'fflate';
import type { Response } from 'supertest';
import { demoIds } from '@/db/demo/seed';
import type { ChainedEvent } from '@/shared/archive/run-records';
import { readArchive } from '@/shared/archive/read-archive';
import { verifyChain } from '@/shared/archive/chain';
import { runSummarySchema } from '@/shared/contracts/runs';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol, sha256 } from '@/tests/support/lab-server';
import { sha256Hex } from '@/server/evaluation/sha256';
import { withoutDatabase } from '@/tests/support/without-database';

jest.setTimeout(60_000);

const database = databaseOfThisFile();
let lab: LabServer;
beforeAll(async () => {
  lab = await LabServer.start(database());
}, 60_000);
afterAll(() => lab.stop());
afterEach(async () => {
  const driver = lab.services.supervisor.activeOf(demoIds.rig);
  if (driver === null) return;
  await lab.intervene(driver.runId, 'stop');
  await lab.advance(60_000, () => driver.isOver());
});

const runs = `/labs/${demoIds.lab}/runs`;
const iso = (offsetMs: number) => new Date(lab.clock.utcMs() + offsetMs).toISOString();

interface Step {
  seq: number;
  path: string;
  kind: string;
  outcome: string;
  station: string;
}
const stepsOf = async (runId: string): Promise<Step[]> => (await lab.as('viewer', 'GET', `${runs}/${runId}/steps`).expect(200)).body.items;

describe('a start', () => {
  test('needs an arm until after the predicted finish', async () => {
    const protocolId = await lab.issue(quickProtocol());
    const unsigned = await lab.askStart(protocolId).expect(409);
    expect(unsigned.body.errors.map(({ path }: { path: string }) => path)).toEqual(['armed', 'cautions']);
    await lab.sign();
    expect((await lab.askStart(protocolId).expect(409)).body).toMatchObject({ code: 'not-armed', errors: [{ path: 'armed' }] });
    await lab.arm(0.02);
    expect((await lab.askStart(protocolId).expect(409)).body).toMatchObject({
      code: 'not-armed',
      detail: expect.stringContaining('arm it for longer'),
    });
    expect((await lab.as('viewer', 'GET', `${runs}?active=true`)).body.items).toEqual([]);
  });

  test('needs a fresh tap: one that is late moves nothing', async () => {
    const protocolId = await lab.issue(quickProtocol());
    await lab.arm();
    const late = await lab.askStart(protocolId, { tappedAt: iso(-5_500) }).expect(409);
    expect(late.body).toMatchObject({ code: 'not-possible-now', detail: expect.stringContaining('was made 6 s ago; it counts for 5 s') });
    await lab.askStart(protocolId, { tappedAt: iso(-4_000) }).expect(201);
  });

  test('on a busy rig is refused, naming the run that has it', async () => {
    await lab.run(quickProtocol({ name: 'The first' }));
    const protocolId = await lab.issue(quickProtocol({ name: 'The second' }));
    const busy = await lab.askStart(protocolId).expect(409);
    expect(busy.body.code).toBe('rig-busy');
    expect(busy.body.detail).toContain('The run of "The first", revision 1, started by Ilse Marrowby, is running.');
  });

  test('sent twice at once with different keys starts one run', async () => {
    const protocolId = await lab.issue(quickProtocol());
    await lab.arm();
    const answers = await Promise.all([lab.askStart(protocolId), lab.askStart(protocolId)]);
    expect(answers.map(({ status }) => status).sort()).toEqual([201, 409]);
  });

  test('repeated with the same key gives the first answer', async () => {
    const protocolId = await lab.issue(quickProtocol());
    await lab.arm();
    const tap = { tappedAt: iso(0), reviewToken: lab.startToken(protocolId) };
    const ask = () => lab.askStart(protocolId, tap).set('Idempotency-Key', 'one-tap');
    const first = await ask().expect(201);
    expect((await ask().expect(201)).body).toEqual(first.body);
    expect((await lab.as('viewer', 'GET', `${runs}?active=true`)).body.items).toHaveLength(1);
  });

  test('with the interlock open is refused', async () => {
    const protocolId = await lab.issue(quickProtocol());
    await lab.arm();
    lab.world.controller(demoIds.rig).openInterlock();
    await lab.advance(2_000);
    const answer = await lab.askStart(protocolId).expect(409);
    expect(answer.body).toMatchObject({
      code: 'not-ready',
      errors: expect.arrayContaining([expect.objectContaining({ path: 'interlock' })]),
    });
    lab.world.controller(demoIds.rig).closeInterlock();
    await lab.advance(2_000);
  });
});

describe('a run', () => {
  test('goes through its steps, is listed, logged and archived, and its chain holds', async () => {
    const runId = await lab.run(quickProtocol({ name: 'Whole' }));
    const running = await lab.until(runId, 'running');
    expect(running).toMatchObject({
      protocolName: 'Whole',
      operator: 'Ilse Marrowby',
      massSetLabel: 'Lead spheres, 1.6 kg',
      dwellsPlanned: 2,
      rehearsal: false,
      simulated: null,
    });
    const rig = await lab.as('viewer', 'GET', `/labs/${demoIds.lab}/rigs/${demoIds.rig}`);
    expect(rig.body.activeRun).toEqual({ id: runId, state: 'running', protocolName: 'Whole' });
    await lab.as('viewer', 'GET', `${runs}/${runId}/archive.zip`).expect(409);
    await lab.as('viewer', 'GET', `${runs}/${runId}/morning`).expect(409);

    await lab.until(runId, 'finished');
    expect((await stepsOf(runId)).map(({ path, outcome, station }) => [path, outcome, station])).toEqual([
      ['1.home', 'done', expect.any(String)],
      ['2.swing', 'done', 'near'],
      ['3.dwell', 'done', 'near'],
      ['4.swing', 'done', 'far'],
      ['5.dwell', 'done', 'far'],
    ]);
    const view = await lab.view(runId);
    expect(view).toMatchObject({ state: 'finished', dwellsDone: 2, reason: '', current: null, mayResume: { ok: false } });

    const events: ChainedEvent[] = [];
    let path: string | null = `${runs}/${runId}/events?limit=5`;
    while (path !== null) {
      const page: Response = await lab.as('viewer', 'GET', path).expect(200);
      events.push(...page.body.items);
      path = page.headers.link === undefined ? null : (/<\/api([^>]+)>/.exec(page.headers.link as string)?.[1] ?? null);
    }
    expect(events.at(-1)?.seq).toBe(view.lastSeq);
    expect(verifyChain(events, sha256)).toMatchObject({ valid: true, events: view.lastSeq });

    const csv = await lab.as('viewer', 'GET', `${runs}/${runId}/steps.csv`).expect(200);
    expect(csv.headers['content-type']).toContain('text/csv');
    expect(csv.headers['content-disposition']).toMatch(/^attachment; filename="evenfall-2031-02-14-whole-[0-9a-f]{8}-steps\.csv"$/);
    expect(csv.text.split('\n')[0]).toMatch(/^seq,path,kind,label,station,planned_start_utc/);
    expect(csv.text.trim().split('\n')).toHaveLength(6);

    const json = await lab.as('viewer', 'GET', `${runs}/${runId}/steps.json`).expect(200);
    expect(json.headers['content-disposition']).toMatch(/^attachment; filename="evenfall-2031-02-14-whole-[0-9a-f]{8}-steps\.json"$/);
    expect(json.body).toMatchObject({ format: 'evenfall-steps', version: 1, run: runId, protocol: view.protocolName, rig: view.rigName });
    const named = (json.body as { steps: Record<string, unknown>[] }).steps;
    expect(named.map((step) => Object.keys(step).join(','))).toEqual(Array(5).fill(csv.text.split('\n')[0]));
    expect(named.map(({ start_utc: at }) => at)).toEqual(
      csv.text
        .trim()
        .split('\n')
        .slice(1)
        .map((line) => line.split(',')[7]),
    );

    await lab.services.idle();
    const zip = await lab
      .as('viewer', 'GET', `${runs}/${runId}/archive.zip`)
      .buffer(true)
      .parse((res, done) => {
        const chunks: Buffer[] = [];
        res.on('data', (chunk: Buffer) => chunks.push(chunk));
        res.on('end', () => done(null, Buffer.concat(chunks)));
      });
    const archive = readArchive(new Map(Object.entries(unzipSync(zip.body as Buffer))), sha256Hex);
    expect(archive.steps).toHaveLength(5);
    expect(archive.warnings).toEqual([]);
  });

  test('is held, resumed and stopped; each act shows who, when, and when the controller confirmed', async () => {
    const runId = await lab.run(quickProtocol());
    await lab.advance(3_600_000, () => lab.services.supervisor.driverOf(runId)?.facts().current?.kind === 'dwell');
    const held = await lab.intervene(runId, 'hold', { who: 'viewer' }).set('Idempotency-Key', 'one-tap').expect(202);
    expect(held.body).toEqual({ runId, serverAt: iso(0) });
    const view = await lab.until(runId, 'held');
    // So that the next process knows a repeat of it.
    expect(lab.services.supervisor.driverOf(runId)?.state().context.actedOn).toEqual([expect.stringMatching(/^\S+ one-tap$/)]);
    expect(view.intervention).toMatchObject({
      kind: 'hold',
      by: 'Pim Oldershaw',
      serverAt: held.body.serverAt,
      confirmedAt: expect.any(String),
    });
    expect(view.mayResume).toEqual({ ok: true, why: '' });
    await lab.intervene(runId, 'hold', { who: 'viewer' }).expect(202);

    const late = await lab.intervene(runId, 'resume', { tappedAt: iso(-6_000) }).expect(409);
    expect(late.body.detail).toContain('it counts for 5 s');
    await lab.intervene(runId, 'resume', { tappedAt: iso(-100) }).expect(202);
    await lab.until(runId, 'running');
    await lab.advance(3_600_000, () => lab.services.supervisor.driverOf(runId)?.facts().current?.kind === 'swing');
    const stopped = await lab.intervene(runId, 'stop', { who: 'analyst' }).expect(202);
    await lab.until(runId, 'stopped');
    const end = await lab.view(runId);
    expect(end.intervention).toMatchObject({
      kind: 'stop',
      by: 'Tam Ferrowdale',
      serverAt: stopped.body.serverAt,
      confirmedAt: expect.any(String),
    });
    expect((await stepsOf(runId)).map(({ outcome }) => outcome)).toContain('cut short');

    await lab.intervene(runId, 'stop').expect(202);
    expect((await lab.intervene(runId, 'hold').expect(409)).body.detail).toBe('The run is over: it was stopped.');
    expect((await lab.intervene(runId, 'resume').expect(409)).body.code).toBe('not-possible-now');
    const audit = await lab.as('owner', 'GET', `/labs/${demoIds.lab}/audit`);
    expect(audit.body.items.map(({ kind, who }: { kind: string; who: string }) => `${kind} ${who}`)).toEqual(
      expect.arrayContaining([
        'run.started Ilse Marrowby',
        'run.hold-asked Pim Oldershaw',
        'run.resumed Ilse Marrowby',
        'run.stop-asked Tam Ferrowdale',
      ]),
    );
  });

  test('holds after this dwell when asked to', async () => {
    const runId = await lab.run(quickProtocol());
    await lab.advance(3_600_000, () => lab.services.supervisor.driverOf(runId)?.facts().current?.kind === 'dwell');
    await lab.intervene(runId, 'hold-after-dwell').expect(202);
    await lab.services.idle();
    expect(await lab.view(runId)).toMatchObject({ state: 'running', holdAfterDwell: true });
    await lab.until(runId, 'held');
    expect((await stepsOf(runId)).at(-1)).toMatchObject({ kind: 'dwell', outcome: 'done' });
  });

  test('whose interlock opens is held, its arm is void', async () => {
    const runId = await lab.run(quickProtocol());
    await lab.advance(30_000);
    lab.world.controller(demoIds.rig).openInterlock();
    const view = await lab.until(runId, 'held');
    expect(view.reason).toMatch(/interlock/i);
    expect(lab.services.arms.armOf(demoIds.rig)).toBeNull();
    lab.world.controller(demoIds.rig).closeInterlock();
    await lab.advance(2_000);
  });

  test('keeps the rig as it is: document and line cannot change under it', async () => {
    await lab.until(await lab.run(quickProtocol()), 'running');
    const rig = `/labs/${demoIds.lab}/rigs/${demoIds.rig}`;
    const { etag } = (await lab.as('keeper', 'GET', rig)).headers as { etag: string };
    const other = await lab.as('keeper', 'PUT', `${rig}/link`).set('If-Match', etag).send({ kind: 'simulated' }).expect(409);
    expect(other.body.detail).toMatch(
      /^The run of ".+", revision 1, started by Ilse Marrowby, is running\. Wait for its end, or stop it\.$/,
    );
    await lab.as('keeper', 'POST', `${rig}/link/try`).send({ kind: 'simulated' }).expect(409);
  });
});

describe('hold and stop', () => {
  test('work when the database is away: the controller decelerates at once, and the log is saved when it is back', async () => {
    const runId = await lab.run(quickProtocol());
    await lab.advance(3_600_000, () => lab.services.supervisor.driverOf(runId)?.facts().current?.kind === 'swing');
    await lab.advance(1_000);
    await withoutDatabase(lab, async () => {
      expect((await lab.as('viewer', 'GET', runs).expect(503)).body.code).toBe('database-away');
      expect(lab.station().link.controller()?.moving).toBe(true);
      await Promise.all([lab.intervene(runId, 'stop', { who: 'viewer' }).expect(202), lab.advance(5_000)]);
      expect(lab.station().link.controller()?.moving).toBe(false);
      expect(lab.services.supervisor.driverOf(runId)?.facts().reason).toMatch(/The database is away since \d\d:\d\d:\d\d UTC/);
    });
    expect((await lab.until(runId, 'stopped')).intervention).toMatchObject({
      kind: 'stop',
      by: 'Pim Oldershaw',
      confirmedAt: expect.any(String),
    });
  });

  test('of a session that ended are refused', async () => {
    const runId = await lab.run(quickProtocol());
    const viewer = '5eed0000-0000-4000-8000-000000000005';
    await lab.as('viewer', 'DELETE', '/session').expect(204);
    expect((await lab.intervene(runId, 'hold', { who: 'viewer' }).expect(401)).body.code).toBe('session-expired');
    await lab.signIn(viewer);
  });
});

describe('the list', () => {
  test('shows the newest first, page by page, of one rig or of those that are active', async () => {
    const all = await lab.as('viewer', 'GET', `${runs}?limit=500`).expect(200);
    const ids = all.body.items.map((item: unknown) => runSummarySchema.parse(item).id);
    const paged: string[] = [];
    let cursor: string | null = null;
    do {
      const page: { body: { items: { id: string }[]; next: string | null } } = await lab
        .as('viewer', 'GET', `${runs}?limit=3${cursor === null ? '' : `&cursor=${cursor}`}`)
        .expect(200);
      paged.push(...page.body.items.map(({ id }) => id));
      cursor = page.body.next;
    } while (cursor !== null);
    expect(paged).toEqual(ids);
    expect((await lab.as('viewer', 'GET', `${runs}?rigId=${demoIds.massSet}`)).body.items).toEqual([]);
    expect((await lab.as('viewer', 'GET', `${runs}?cursor=nonsense`).expect(400)).body.errors[0].path).toBe('cursor');
    await lab.as('viewer', 'GET', `${runs}?limit=501`).expect(400);
  });
});
