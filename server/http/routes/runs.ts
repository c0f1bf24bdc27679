import type { Response } from 'express';
import * as reviewContracts from '@/shared/contracts/reviews';
import * as contracts from '@/shared/contracts/runs';
import { stepsCsv } from '@/shared/archive/step-csv';
import type { RunDriver } from '@/server/engine/run-driver';
import { resumePlan } from '@/server/engine/run-facts';
import type { Answer } from '@/server/engine/run-driver-parts';
import type { Clock } from '@/server/interfaces/clock';
import { findProtocol, findRevision } from '@/server/store/protocols';
import { findMassSet, findRig } from '@/server/store/rigs';
import * as store from '@/server/store/runs-read';
import { auditLater } from '../audited';
import { archiveInputOf, assertEnded } from '../archive-input';
import { assertFreshTap, beginRehearsal, beginRun, type Caller } from '../begin-run';
import { isoOf } from '../maker';
import { decodeCursor, pageFrom } from '../paging';
import { notFound, ProblemError } from '../problem-error';
import { mount } from '../route-context';
import { resumeSubject, startSubject } from '../reviews';
import { runSummaryOf, storedRunView } from '../run-view';
import type { Services } from '../services';

async function load(services: Services, labId: string, runId: string): Promise<store.RunRecord> {
  const run = await store.findRun(services.database.db, labId, runId);
  if (run === null) throw notFound('run');
  return run;
}

const startRoutes = [
  mount(contracts.listRuns, async ({ query, membership, services }) => {
    const after = decodeCursor(query.cursor, ['number', 'string']);
    const rows = await store.listRuns(services.database.db, {
      labId: membership.labId,
      rigId: query.rigId,
      activeOnly: query.active === 'true',
      after: after === null ? null : { createdAt: after[0], id: after[1] },
      limit: query.limit + 1,
    });
    const page = pageFrom(rows, query.limit, (row) => [row.createdAt, row.id]);
    return { items: page.items.map(runSummaryOf), next: page.next };
  }),

  mount(contracts.startRun, async (context) => {
    const { body, membership, services } = context;
    const { db } = services.database;
    const rig = await findRig(db, membership.labId, body.rigId);
    if (rig === null) throw notFound('rig');
    const revision = await findRevision(db, { labId: membership.labId, protocolId: body.protocolId }, body.revision);
    if (revision === null) throw notFound('protocol revision');
    const massSet = await findMassSet(db, { labId: membership.labId, rigId: rig.id }, body.massSetId);
    if (massSet === null) throw notFound('mass set');
    assertFreshTap(body.tappedAt, services.clock.utcMs(), 'start');
    services.reviews.take(body.reviewToken, { userId: context.me.userId, rigId: rig.id, subject: startSubject(body) });
    const run = await beginRun(context, {
      rig,
      protocolId: body.protocolId,
      protocol: revision.document,
      revision: revision.number,
      massSet,
      notes: body.notes,
    });
    return runSummaryOf(run);
  }),

  mount(contracts.rehearse, async (context) => {
    const { body, membership, services } = context;
    const { db } = services.database;
    const rig = await findRig(db, membership.labId, body.rigId);
    if (rig === null) throw notFound('rig');
    const protocol = await findProtocol(db, membership.labId, body.protocolId);
    if (protocol === null) throw notFound('protocol');
    const revision =
      body.revision === undefined ? null : await findRevision(db, { labId: membership.labId, protocolId: protocol.id }, body.revision);
    if (body.revision !== undefined && revision === null) throw notFound('protocol revision');
    const run = await beginRehearsal(context, {
      rig,
      protocolId: protocol.id,
      protocol: revision?.document ?? protocol.document,
      revision: revision?.number ?? 0,
      notes: '',
      seed: body.seed,
    });
    return runSummaryOf(run);
  }),

  mount(contracts.getRun, async ({ params, membership, services }) => {
    const view = services.activeRuns.view(membership.labId, params.runId);
    return view ?? storedRunView(services, await load(services, membership.labId, params.runId));
  }),
];

const longestWaitMs = 20_000;

/** Waits for something, but no longer than this. */
async function atMost(longestMs: number, awaited: Promise<unknown>, clock: Clock): Promise<void> {
  let cancel = () => undefined as void;
  const longest = new Promise<void>((resolve) => {
    cancel = clock.after(longestMs, resolve);
  });
  await Promise.race([awaited, longest]);
  cancel();
}

/** The driver of a run; for one that is over, or that nobody drives, the reason why nothing can be done with it. */
async function driverOf(services: Services, labId: string, runId: string): Promise<RunDriver> {
  const atOnce = services.activeRuns.find(labId, runId);
  if (atOnce !== null) return atOnce.driver;
  const run = await load(services, labId, runId);
  if (run.rehearsal) throw new ProblemError('not-possible-now', 'A rehearsal runs by itself in fast time; nobody can step in.');
  if (['finished', 'stopped', 'failed'].includes(run.state))
    throw new ProblemError(
      'not-possible-now',
      `The run is over: it ${run.state === 'failed' ? 'failed' : run.state === 'stopped' ? 'was stopped' : 'has finished'}.`,
    );
  // A server that has just started may still be taking up the runs it found.
  await atMost(longestWaitMs, services.takenUp, services.clock);
  const later = services.activeRuns.find(labId, runId);
  if (later !== null) return later.driver;
  const why =
    services.supervisor.quarantinedOf(run.rigId)?.why ??
    'No server drives this run at the moment, so nothing keeps the turntable moving: its motion lease lapses within 2 s.';
  throw new ProblemError('not-possible-now', `${why} Use the switch at the rig if anything moves.`);
}

const longestKeepingMs = 1_000;

/** The controller has it already; the answer waits until it is safe on a disk, so that nothing that was answered can be forgotten. */
async function accepted({ clock }: Services, runId: string, answer: Answer): Promise<{ runId: string; serverAt: string }> {
  if (!answer.ok) throw new ProblemError('not-possible-now', answer.why);
  if (answer.kept !== undefined) await atMost(longestKeepingMs, answer.kept, clock);
  return { runId, serverAt: isoOf(answer.serverAtUtcMs) };
}

const reviewRoutes = [
  mount(reviewContracts.reviewStart, async ({ params, body, me, membership, services }) => {
    const { db } = services.database;
    const rig = await findRig(db, membership.labId, params.rigId);
    if (rig === null) throw notFound('rig');
    if ((await findRevision(db, { labId: membership.labId, protocolId: body.protocolId }, body.revision)) === null)
      throw notFound('protocol revision');
    if ((await findMassSet(db, { labId: membership.labId, rigId: rig.id }, body.massSetId)) === null) throw notFound('mass set');
    const { token, expiresUtcMs } = services.reviews.issue({ userId: me.userId, rigId: rig.id, subject: startSubject(body) });
    return { token, expiresAt: isoOf(expiresUtcMs) };
  }),

  mount(reviewContracts.reviewResume, async ({ params, me, membership, services }) => {
    const driver = await driverOf(services, membership.labId, params.runId);
    const found = services.activeRuns.find(membership.labId, params.runId);
    const plan = found === null ? null : resumePlan(found.run.start, driver.state(), services.clock.utcMs());
    if (found === null || plan === null) throw new ProblemError('not-possible-now', 'The run is not held, so there is nothing to resume.');
    const { rigId } = found.run;
    const { token, expiresUtcMs } = services.reviews.issue({ userId: me.userId, rigId, subject: resumeSubject(params.runId) });
    return { token, expiresAt: isoOf(expiresUtcMs), dwellsLeft: plan.dwellsLeft, finishAt: isoOf(plan.finishUtcMs) };
  }),
];

const interventionRoutes = [
  mount(contracts.holdRun, async (context) => {
    const { params, me, membership, services } = context;
    const answer = (await driverOf(services, membership.labId, params.runId)).hold(me.name);
    auditLater(context, 'run.hold-asked', { runId: params.runId });
    return accepted(services, params.runId, answer);
  }),

  mount(contracts.holdAfterDwell, async (context) => {
    const { params, me, membership, services } = context;
    const answer = (await driverOf(services, membership.labId, params.runId)).holdAfterDwell(me.name);
    auditLater(context, 'run.hold-after-dwell-asked', { runId: params.runId });
    return accepted(services, params.runId, answer);
  }),

  mount(contracts.resumeRun, async (context) => {
    const { params, body, me, membership, services } = context;
    const driver = await driverOf(services, membership.labId, params.runId);
    // After the waiting for a server that has just begun: what grew old meanwhile moves nothing.
    assertFreshTap(body.tappedAt, services.clock.utcMs(), 'resume');
    const { rigId } = (services.activeRuns.find(membership.labId, params.runId) ?? { run: { rigId: '' } }).run;
    services.reviews.take(body.reviewToken, { userId: me.userId, rigId, subject: resumeSubject(params.runId) });
    const answer = await driver.resume(me.name);
    if (!answer.ok) {
      const locked = services.locks.lockedBy(rigId) !== null;
      const disarmed = driver.state().state === 'held' && services.arms.armOf(rigId) === null;
      throw new ProblemError(locked ? 'locked' : disarmed ? 'not-armed' : 'not-possible-now', answer.why);
    }
    auditLater(context, 'run.resumed', { runId: params.runId });
    return accepted(services, params.runId, answer);
  }),

  mount(contracts.stopRun, async (context) => {
    const { params, me, membership, services } = context;
    const found = services.activeRuns.find(membership.labId, params.runId);
    if (found === null) {
      const run = await load(services, membership.labId, params.runId);
      if (run.state === 'stopped') return { runId: run.id, serverAt: isoOf(services.clock.utcMs()) };
      if (services.supervisor.quarantinedOf(run.rigId)?.start.runId === run.id) return endQuarantined(context, run);
    }
    const answer = (await driverOf(services, membership.labId, params.runId)).stop(me.name);
    auditLater(context, 'run.stop-asked', { runId: params.runId });
    return accepted(services, params.runId, answer);
  }),
];

/** Ends a run that this version cannot drive: nothing moves, and the rig is free again. */
async function endQuarantined(caller: Caller, run: store.RunRecord): Promise<{ runId: string; serverAt: string }> {
  const { services, me } = caller;
  const nowUtcMs = services.clock.utcMs();
  const why = services.supervisor.quarantinedOf(run.rigId)?.why ?? '';
  await store.markRunFailed(services.database.db, run, { why: `${why} Ended by ${me.name}.`, nowUtcMs });
  services.supervisor.release(run.rigId);
  auditLater(caller, 'run.stop-asked', { runId: run.id });
  return { runId: run.id, serverAt: isoOf(nowUtcMs) };
}

/** A name that says what the file is, with nothing in it that a file system or a header could misread. */
function attach(res: Response, run: store.RunRecord, ending: string): void {
  const name =
    run.protocolName
      .toLowerCase()
      .replaceAll(/[^a-z0-9]+/g, '-')
      .replaceAll(/^-|-$/g, '')
      .slice(0, 40) || 'run';
  const day = isoOf(run.startedAt ?? run.createdAt).slice(0, 10);
  res.set('Content-Disposition', `attachment; filename="evenfall-${day}-${name}-${run.id.slice(0, 8)}${ending}"`);
}

const recordRoutes = [
  mount(contracts.listSteps, async ({ params, membership, services }) => {
    const run = await load(services, membership.labId, params.runId);
    return { items: await store.readSteps(services.database.db, { labId: run.labId, runId: run.id }) };
  }),

  mount(contracts.stepsCsv, async ({ params, membership, services, res }) => {
    const run = await load(services, membership.labId, params.runId);
    const text = stepsCsv(await store.readSteps(services.database.db, { labId: run.labId, runId: run.id }));
    attach(res, run, '-steps.csv');
    res.type('text/csv').send(text);
    return undefined;
  }),

  mount(contracts.listEvents, async ({ params, query, membership, services }) => {
    const run = await load(services, membership.labId, params.runId);
    const [afterSeq] = decodeCursor(query.cursor, ['number']) ?? [0];
    const events = await store.readEvents(services.database.db, { labId: run.labId, runId: run.id }, { afterSeq, limit: query.limit + 1 });
    return pageFrom(events, query.limit, (event) => [event.seq]);
  }),

  mount(contracts.downloadArchive, async ({ params, membership, services, res }) => {
    const run = await load(services, membership.labId, params.runId);
    assertEnded(run);
    const zip = await services.tasks.zipArchive(await archiveInputOf(services, run));
    attach(res, run, '.zip');
    res.type('application/zip').send(Buffer.from(zip.buffer, zip.byteOffset, zip.byteLength));
    return undefined;
  }),
];

export const runRoutes = [...startRoutes, ...reviewRoutes, ...interventionRoutes, ...recordRoutes];
