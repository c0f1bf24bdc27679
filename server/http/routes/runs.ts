import type { Response } from 'express';
import { readMorning } from '@/shared/contracts/morning';
import * as contracts from '@/shared/contracts/runs';
import { stepsCsv } from '@/shared/archive/step-csv';
import { stepsJson } from '@/shared/archive/step-json';
import { findProtocol, findRevision } from '@/server/store/protocols';
import { findMassSet, findRig } from '@/server/store/rigs';
import * as store from '@/server/store/runs-read';
import { archivedFramesOf, archiveInputOf, assertEnded } from '../archive-input';
import { attach, fileWords } from '../attachment';
import { assertFreshTap, beginRehearsal, beginRun } from '../begin-run';
import { atTheRig, rigOfBody, rigOfItsRun } from '../desk/at-the-rig';
import { isDatabaseAway } from '../../store/failures';
import { isoOf } from '../maker';
import { morningOf } from '../morning';
import { decodeCursor, pageFrom } from '../paging';
import { notFound } from '../problem-error';
import { mount } from '../route-context';
import { startSubject } from '../reviews';
import { startUtcMsOf } from '../run-window';
import { loadRun as load, runSummaryOf, storedRunView } from '../run-view';

const listRoutes = [
  mount(contracts.listRuns, async ({ query, membership, services }) => {
    const { labId } = membership;
    const after = decodeCursor(query.cursor, ['number', 'string']);
    const asked = {
      ...{ labId, rigId: query.rigId, activeOnly: query.active === 'true', limit: query.limit + 1 },
      after: after === null ? null : { createdAt: after[0], id: after[1] },
    };
    const rows = await store.listRuns(services.database.db, asked).catch((error: unknown) => {
      if (!asked.activeOnly || !isDatabaseAway(error) || !services.config.roles.includes('rig')) throw error;
      return null;
    });
    if (rows === null) return { items: services.activeRuns.summaries(labId).slice(0, query.limit), next: null };
    const page = pageFrom(rows, query.limit, (row) => [row.createdAt, row.id]);
    return { items: page.items.map(runSummaryOf), next: page.next };
  }),
];

const startRoutes = [
  mount(contracts.startRun, async (context) => {
    const { body, membership, services } = context;
    const { db } = services.database;
    const rig = await findRig(db, membership.labId, body.rigId);
    if (rig === null) throw notFound('rig');
    const revision = await findRevision(db, { labId: membership.labId, protocolId: body.protocolId }, body.revision);
    if (revision === null) throw notFound('protocol revision');
    const massSet = await findMassSet(db, { labId: membership.labId, rigId: rig.id }, body.massSetId);
    if (massSet === null) throw notFound('mass set');
    const stillCounts = () => void assertFreshTap(body.tappedAt, services.clock.utcMs(), 'start');
    stillCounts();
    services.reviews.take(body.reviewToken, { userId: context.me.userId, rigId: rig.id, subject: startSubject(body) });
    const run = await beginRun(context, {
      rig,
      protocolId: body.protocolId,
      protocol: revision.document,
      revision: revision.number,
      massSet,
      notes: body.notes,
      stillCounts,
    });
    return runSummaryOf(run);
  }),
];

const rehearseRoutes = [
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
];

const viewRoutes = [
  mount(contracts.getRun, async ({ params, membership, services }) => {
    const view = services.activeRuns.view(membership.labId, params.runId);
    return view ?? storedRunView(services, await load(services, membership.labId, params.runId));
  }),
];

/** A name that says what the file is. */
function attachOf(res: Response, run: store.RunRecord, ending: string): void {
  const day = isoOf(startUtcMsOf(run)).slice(0, 10);
  attach(res, `evenfall-${day}-${fileWords(run.protocolName, 'run')}-${run.id.slice(0, 8)}${ending}`);
}

const recordRoutes = [
  mount(contracts.listSteps, async ({ params, membership, services }) => {
    const run = await load(services, membership.labId, params.runId);
    return { items: await store.readSteps(services.database.db, { labId: run.labId, runId: run.id }) };
  }),

  mount(contracts.stepsCsv, async ({ params, membership, services, res }) => {
    const run = await load(services, membership.labId, params.runId);
    const text = stepsCsv(await store.readSteps(services.database.db, { labId: run.labId, runId: run.id }));
    attachOf(res, run, '-steps.csv');
    res.type('text/csv').send(text);
    return undefined;
  }),

  mount(contracts.stepsJson, async ({ params, membership, services, res }) => {
    const run = await load(services, membership.labId, params.runId);
    const steps = await store.readSteps(services.database.db, { labId: run.labId, runId: run.id });
    attachOf(res, run, '-steps.json');
    res.type('application/json').send(stepsJson({ run: run.id, protocol: run.protocolName, rig: run.rigName }, steps));
    return undefined;
  }),

  mount(contracts.listEvents, async ({ params, query, membership, services }) => {
    const run = await load(services, membership.labId, params.runId);
    const [afterSeq] = decodeCursor(query.cursor, ['number']) ?? [0];
    const page = { afterSeq, limit: query.limit + 1, kind: query.kind };
    const events = await store.readEvents(services.database.db, { labId: run.labId, runId: run.id }, page);
    return pageFrom(events, query.limit, (event) => [event.seq]);
  }),

  mount(readMorning, async ({ params, membership, services }) => {
    const run = await load(services, membership.labId, params.runId);
    if (run.state !== 'held') assertEnded(run);
    return morningOf(services, run);
  }),

  mount(contracts.downloadArchive, async ({ params, membership, services, res }) => {
    const run = await load(services, membership.labId, params.runId);
    assertEnded(run);
    const zip = await services.tasks.zipArchive({ ...(await archiveInputOf(services, run)), ...(await archivedFramesOf(services, run)) });
    attachOf(res, run, '.zip');
    res.type('application/zip').send(Buffer.from(zip.buffer, zip.byteOffset, zip.byteLength));
    return undefined;
  }),
];

export const runRoutes = [
  ...listRoutes,
  ...rehearseRoutes,
  ...recordRoutes,
  ...atTheRig(rigOfBody, startRoutes),
  ...atTheRig(rigOfItsRun, viewRoutes, { urgent: true, elseStored: true }),
];
