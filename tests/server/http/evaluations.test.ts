import { demoIds } from '@/db/demo/seed';
import { readZip } from '@/server/evaluation/archive-files';
import { evaluationViewSchema } from '@/shared/contracts/evaluations';
import { exclusionViewSchema } from '@/shared/contracts/exclusions';
import type { StepRowView } from '@/shared/contracts/runs';
import { compareResults } from '@/shared/evaluation/compare-results';
import { morningSheetSchema } from '@/shared/contracts/morning';
import { CODATA_2022_G } from '@/shared/physics/constants';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol } from '@/tests/support/lab-server';
import { outsideWorld } from './outside-world';

jest.setTimeout(120_000);

const database = databaseOfThisFile();
const outside = outsideWorld();
let lab: LabServer;
beforeAll(async () => {
  lab = await LabServer.start(database(), { overrides: outside.overrides });
}, 60_000);
afterAll(() => lab.stop());

const labPath = `/labs/${demoIds.lab}`;
const ask = (runId: string, body: object = {}) => lab.as('analyst', 'POST', `${labPath}/runs/${runId}/evaluations`).send(body);
const rehearse = async (body: object) => {
  const asked = await lab
    .as('operator', 'POST', `${labPath}/rehearsals`)
    .send({ rigId: demoIds.rig, protocolId: demoIds.shortProtocol, revision: 1, ...body })
    .expect(202);
  await lab.services.idle();
  await lab.advance(31_000);
  return lab.view(asked.body.id as string);
};

const archiveOf = async (runId: string) => {
  const zip = await lab.as('viewer', 'GET', `${labPath}/runs/${runId}/archive.zip`).responseType('blob').expect(200);
  return readZip(zip.body as Buffer);
};

const excludedIn = (files: ReadonlyMap<string, Uint8Array>) => new TextDecoder().decode(files.get('exclusions.csv'));

/** Excludes the second dwell of a run. Returns its row. */
async function excludes(runId: string) {
  const steps = await lab.as('viewer', 'GET', `${labPath}/runs/${runId}/steps`).expect(200);
  const row = (steps.body.items as StepRowView[]).filter(({ kind }) => kind === 'dwell')[1];
  if (row === undefined) throw new Error('the run has two dwells');
  const body = { startUtcMs: row.startUtcMs, endUtcMs: row.endUtcMs, reason: 'somebody came in' };
  await lab.as('analyst', 'POST', `${labPath}/runs/${runId}/exclusions`).send(body).expect(201);
  return row;
}

test('a rehearsal of the short protocol is stored like a run, and its evaluation gives back the G it was made with', async () => {
  const run = await rehearse({ seed: 3 });
  expect(run).toMatchObject({
    state: 'finished',
    rehearsal: true,
    protocolRevision: 1,
    dwellsDone: 12,
    dwellsPlanned: 12,
    simulated: { trueG: CODATA_2022_G.value, seed: 3 },
  });
  const queued = await ask(run.id).expect(202);
  expect(queued.body).toMatchObject({ state: 'queued', channel: 'deflection', createdBy: 'Tam Ferrowdale', result: null });
  await lab.services.idle();
  await lab.advance(31_000);
  const { body } = await lab.as('viewer', 'GET', `${labPath}/evaluations/${queued.body.id as string}`).expect(200);
  const done = evaluationViewSchema.parse(body);
  expect(done).toMatchObject({ state: 'done', error: null, result: { registered: true, chain: { valid: true } } });
  const { G, reversal_rad: reversal } = done.result ?? {};
  // Eleven reversals between twelve alternating dwells; G within two of its own standard uncertainties of the simulator's.
  expect(reversal?.count).toBe(11);
  expect(Math.abs((G?.value ?? 0) - CODATA_2022_G.value)).toBeLessThan(2 * (G?.u ?? 0));
  expect((G?.u ?? 1) / (G?.value ?? 1)).toBeLessThan(0.01);
  // Twelve dwells and the ring-down after the kick.
  expect(done.curves?.length).toBe(13);
  const list = await lab.as('viewer', 'GET', `${labPath}/runs/${run.id}/evaluations`).expect(200);
  expect(list.body.items).toHaveLength(1);
  expect(list.body.items[0].curves).toBeUndefined();

  const morning = await lab.as('viewer', 'GET', `${labPath}/runs/${run.id}/morning`).expect(200);
  const sheet = morningSheetSchema.parse(morning.body);
  expect(sheet).toMatchObject({ dwells: { planned: 12, done: 12, good: 12 }, lost: [], worst: [], earlier: [] });
  expect(sheet.ticks.filter(({ ok }) => ok !== true).map(({ code }) => code)).toEqual([]);
  expect(Math.abs(Date.parse(sheet.plannedEndAt ?? '') - Date.parse(run.endedAt ?? ''))).toBeLessThan(1000);
  expect(sheet.tonight?.reversal_rad.value).toBe(reversal?.value);
  expect((sheet.shares?.night ?? 0) + (sheet.shares?.geometry ?? 0)).toBeCloseTo(1, 9);
  expect(sheet.next.at(-1)?.act).toMatch(/^(go|first)$/);

  const at = `${labPath}/evaluations/${done.id}`;
  expect((await lab.as('analyst', 'POST', `${at}/recomputations`).expect(409)).body.detail).toMatch(/not frozen/);
  await lab.as('analyst', 'POST', `${at}/freeze`).send({ reason: ' ' }).expect(400);
  const frozen = await lab.as('analyst', 'POST', `${at}/freeze`).send({ reason: 'for the thesis' }).expect(200);
  expect(frozen.body.frozen).toMatchObject({ by: 'Tam Ferrowdale', reason: 'for the thesis' });
  expect((await lab.as('owner', 'POST', `${at}/freeze`).send({ reason: 'once more' }).expect(409)).body.detail).toMatch(
    /^Tam Ferrowdale froze this evaluation already/,
  );
  const { pool } = database().connection;
  await expect(pool.query('update evaluations set frozen_at = null where id = $1', [done.id])).rejects.toThrow(/never changed/);
  const audit = await lab.as('owner', 'GET', `${labPath}/audit?kind=run.evaluation-frozen`).expect(200);
  expect(audit.body.items[0].data).toMatchObject({ evaluationId: done.id, reason: 'for the thesis' });

  const kept = JSON.parse(new TextDecoder().decode((await archiveOf(run.id)).get('evaluation.json'))) as Record<string, unknown>;
  expect(kept).toMatchObject({ G: done.result?.G, frozen: { by: 'Tam Ferrowdale', reason: 'for the thesis', software: done.software } });

  const report = await lab.as('viewer', 'GET', `${at}/report.pdf`).responseType('blob').expect(200);
  expect((report.body as Buffer).toString('latin1', 0, 5)).toBe('%PDF-');
  expect(report.headers['content-type']).toBe('application/pdf');

  // What is excluded after the freezing changes nothing of what is frozen: neither its recomputation nor its archive.
  const row = await excludes(run.id);
  expect(excludedIn(await archiveOf(run.id))).toBe('');

  const again = await lab.as('analyst', 'POST', `${at}/recomputations`).expect(202);
  expect(again.body).toMatchObject({ state: 'queued', recomputes: done.id, channel: 'deflection' });
  await lab.services.idle();
  await lab.advance(31_000);
  const recomputed = evaluationViewSchema.parse((await lab.as('viewer', 'GET', `${labPath}/evaluations/${again.body.id as string}`)).body);
  expect(recomputed).toMatchObject({ state: 'done', software: done.software });
  expect(done.software).toMatch(/^\d+\.\d+/);
  if (done.result === null || recomputed.result === null) throw new Error('both came to a result');
  expect(compareResults(done.result, recomputed.result, demoRigWide)).toEqual([]);
  await lab.as('analyst', 'POST', `${labPath}/evaluations/${recomputed.id}/freeze`).send({ reason: 'this too' }).expect(409);

  // One asked for afterwards does without the dwell and says so; once it is frozen the archive tells what was excluded, and why.
  const next = await ask(run.id).expect(202);
  await lab.services.idle();
  await lab.advance(31_000);
  const nextAt = `${labPath}/evaluations/${next.body.id as string}`;
  const { result } = evaluationViewSchema.parse((await lab.as('viewer', 'GET', nextAt).expect(200)).body);
  expect(result?.dwells.filter(({ used }) => !used)).toMatchObject([{ seq: row.seq, why: 'no samples' }]);
  expect(result?.warnings.map(({ code }) => code)).toContain('excluded-by-hand');
  await lab.as('analyst', 'POST', `${nextAt}/freeze`).send({ reason: 'without the visitor' }).expect(200);
  expect(excludedIn(await archiveOf(run.id))).toMatch(/^\d{4}-\S*Z,\d{4}-\S*Z,somebody came in$/m);
});

test('what cannot be excluded is refused with what would be right; who excluded what, and why, stays in the list and in the audit', async () => {
  const run = await rehearse({ protocolId: await lab.issue(quickProtocol()), seed: 6 });
  const at = `${labPath}/runs/${run.id}/exclusions`;
  const began = Date.parse(run.startedAt ?? '');
  const asks = (body: object) =>
    lab.as('analyst', 'POST', at).send({ startUtcMs: began, endUtcMs: began + 9000, reason: 'a lorry', ...body });
  expect((await asks({ endUtcMs: began }).expect(400)).body.errors).toEqual([{ path: 'endUtcMs', message: 'after startUtcMs' }]);
  expect((await asks({ startUtcMs: began - 60_000 }).expect(400)).body.detail).toMatch(
    /^The stretch reaches beyond the run, which goes from 2/,
  );
  expect((await asks({ endUtcMs: 1e300 }).expect(400)).body.errors[0].path).toBe('endUtcMs');
  await asks({ reason: '  ' }).expect(400);
  const made = exclusionViewSchema.parse((await asks({}).expect(201)).body);
  expect((await asks({ startUtcMs: began + 1000 }).expect(409)).body.detail).toBe(
    'Tam Ferrowdale excluded all of this stretch already: a lorry',
  );
  const withdraws = () => lab.as('operator', 'POST', `${labPath}/exclusions/${made.id}/withdraw`).send({ reason: 'no lorry' });
  expect(excludedIn(await archiveOf(run.id))).toContain(',a lorry');
  await withdraws().expect(200);
  expect(excludedIn(await archiveOf(run.id))).toBe('');
  expect((await withdraws().expect(409)).body.detail).toMatch(/ withdrew this exclusion already\.$/);
  const { items } = (await lab.as('viewer', 'GET', at).expect(200)).body as { items: unknown[] };
  expect(items).toEqual([{ ...made, withdrawn: { at: expect.any(String), by: expect.any(String), reason: 'no lorry' } }]);
  const audit = await lab.as('owner', 'GET', `${labPath}/audit?kind=run`).expect(200);
  const entries = (audit.body.items as { kind: string; data: { exclusionId?: string } }[]).filter(
    ({ data }) => data.exclusionId === made.id,
  );
  expect(entries.map(({ kind }) => kind)).toEqual(['run.exclusion-withdrawn', 'run.data-excluded']);
});

test('a note to a row of the step log stays with name and time, in the archive too; it needs a row and some words', async () => {
  const run = await rehearse({ protocolId: await lab.issue(quickProtocol()), seed: 7 });
  const at = `${labPath}/runs/${run.id}/notes`;
  expect((await archiveOf(run.id)).has('notes.csv')).toBe(false);
  const writes = (body: object) => lab.as('analyst', 'POST', at).send({ seq: 3, text: 'a lorry, then "quiet"', ...body });
  await writes({ text: ' ' }).expect(400);
  expect((await writes({ seq: 3_000_000_000 }).expect(400)).body).toMatchObject({ code: 'invalid-input', errors: [{ path: 'seq' }] });
  expect((await writes({ seq: 99 }).expect(404)).body.detail).toMatch(/row of the step log/);
  const { body: note } = await writes({}).expect(201);
  expect(note).toMatchObject({ seq: 3, text: 'a lorry, then "quiet"', by: 'Tam Ferrowdale' });
  expect((await lab.as('viewer', 'GET', at).expect(200)).body.items).toEqual([note]);
  const { pool } = database().connection;
  await expect(pool.query('update step_notes set text = $1', ['nothing'])).rejects.toThrow(/never changed/);
  const csv = new TextDecoder().decode((await archiveOf(run.id)).get('notes.csv'));
  expect(csv).toMatch(/^seq,at_utc,by,text\n3,2\S+Z,Tam Ferrowdale,"a lorry, then ""quiet"""\n$/);
  const audit = await lab.as('owner', 'GET', `${labPath}/audit?kind=run.step-noted`).expect(200);
  expect(audit.body.items[0].data).toMatchObject({ runId: run.id, noteId: note.id, seq: 3 });
});

test('a run whose data cannot give a result says why', async () => {
  const protocolId = await lab.issue({ formatVersion: 1, name: 'Still', steps: [{ kind: 'home' }, { kind: 'settle', for_s: 60 }] });
  const run = await rehearse({ protocolId });
  const queued = await ask(run.id).expect(202);
  await lab.services.idle();
  await lab.advance(31_000);
  const { body } = await lab.as('viewer', 'GET', `${labPath}/evaluations/${queued.body.id as string}`);
  if (body.state === 'failed') expect(body.error).toMatch(/\w+ \w+ \w+/);
  else expect(body.result.G).toBeNull();
});

test('a run that has not ended, a channel without data, a run without deflection', async () => {
  const runId = await lab.run(quickProtocol());
  expect((await ask(runId).expect(409)).body.detail).toMatch(/^The run is (starting|running)\. Wait for its end, or stop it\.$/);
  await lab.until(runId, 'finished');
  expect((await ask(runId, { channel: 'spot' }).expect(422)).body).toMatchObject({
    code: 'cannot-evaluate',
    detail: 'The channel "spot" has no deflection within this run; these have: deflection.',
  });
  await lab.services.idle();
  await database().connection.pool.query('delete from samples');
  expect((await ask(runId).expect(422)).body.detail).toBe('No deflection lies within this run. Bring the file of the readout in first.');
});

test('a rehearsal of a draft, and one that is refused', async () => {
  const made = await lab.as('operator', 'POST', `${labPath}/protocols`).send({ document: quickProtocol() }).expect(201);
  const run = await rehearse({ protocolId: made.body.id, revision: undefined });
  expect(run).toMatchObject({ state: 'finished', protocolRevision: 0 });
  expect((await lab.as('viewer', 'GET', `${labPath}/rigs/${demoIds.rig}`)).body.activeRun).toBeNull();
  const lost = await lab
    .as('operator', 'POST', `${labPath}/protocols`)
    .send({ document: quickProtocol({ steps: [{ kind: 'swing', to: 'nowhere' }] }) })
    .expect(201);
  await lab.as('operator', 'POST', `${labPath}/rehearsals`).send({ rigId: demoIds.rig, protocolId: lost.body.id }).expect(422);
  expect((await lab.intervene(run.id, 'hold').expect(409)).body.detail).toContain('A rehearsal runs by itself');
});

const longSteps = quickProtocol().steps.map((step) => (step.kind === 'dwell' ? { ...step, for_s: 1000 } : step));

test('a run that is over is evaluated by itself, and whoever started it gets its morning sheet', async () => {
  const runId = await lab.run(quickProtocol({ name: 'A short night', steps: longSteps }));
  await lab.until(runId, 'finished');
  outside.mails.length = 0;
  // Two minutes for what is still on its way, then the evaluation, then the message.
  for (const ms of [121_000, 31_000, 31_000, 31_000]) await lab.advance(ms);
  const { body } = await lab.as('viewer', 'GET', `${labPath}/runs/${runId}/evaluations`).expect(200);
  expect(body.items).toHaveLength(1);
  expect(body.items[0]).toMatchObject({ createdBy: 'Evenfall', channel: 'deflection' });
  const sheets = outside.mails.filter(({ subject }) => subject.startsWith('Morning sheet: A short night on '));
  expect(sheets).toHaveLength(1);
  expect(sheets[0]?.text).toMatch(/^Finished \d\d:\d\d \w{3}, Europe\/Zurich, as planned\./);
  expect(sheets[0]?.text).toContain('May I go in?');
  expect(sheets[0]?.text).toContain('2 of 2 dwells are good');
  expect(sheets[0]?.text).toMatch(new RegExp(`/runs/${runId}\\n$`));
});
