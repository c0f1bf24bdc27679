import * as contracts from '@/shared/contracts/rigs';
import * as store from '@/server/store/rigs';
import { activeRuns } from '@/server/store/runs-read';
import { audited, auditLater } from '../audited';
import { anyRig, atTheRig, rigOfAddress } from '../desk/at-the-rig';
import { isoOf, makerOf } from '../maker';
import { notFound, ProblemError } from '../problem-error';
import { knowsLink, knowsRevision, rigSummaryOf, rigTag, rigViewOf } from '../rig-view';
import { mount, type Membership, type SignedIn } from '../route-context';
import type { Services } from '../services';
import { makeStartChecks } from '../start-checks';
import { busyWords } from '../start-checks-lab';
import { findRevision } from '@/server/store/protocols';

type Caller = { me: SignedIn; membership: Membership; services: Services };

async function load({ membership, services }: Pick<Caller, 'membership' | 'services'>, rigId: string): Promise<store.RigRecord> {
  const rig = await store.findRig(services.database.db, membership.labId, rigId);
  if (rig === null) throw notFound('rig');
  return rig;
}

/** While a run has the rig, what it stands on must not change. */
async function assertFree(services: Services, rig: store.RigRecord): Promise<void> {
  const run = (await activeRuns(services.database.db, rig.labId)).get(rig.id);
  if (run !== undefined) throw new ProblemError('rig-busy', busyWords(run));
}

/** Neither a run nor a person at the guided first move has the rig. */
async function assertUntouched(services: Services, rig: store.RigRecord): Promise<void> {
  await assertFree(services, rig);
  const guidedBy = services.guided.takenBy(rig.id);
  if (guidedBy !== null) throw new ProblemError('rig-busy', guidedBy);
}

const listRoutes = [
  mount(contracts.listRigs, async ({ membership, services }) => {
    const { db } = services.database;
    const [rigs, runs] = [await store.listRigs(db, membership.labId), await activeRuns(db, membership.labId)];
    return { items: rigs.map((rig) => rigSummaryOf(services, rig, runs.get(rig.id))) };
  }),
];

const makeRoutes = [
  mount(contracts.createRig, async (context) => {
    const { body, membership, services } = context;
    const entry = { kind: 'rig.added', data: (rigId: string) => ({ rigId, name: body.name }) };
    const rigId = await audited(context, entry, (tx) =>
      store.createRig(tx, { labId: membership.labId, ...body, massSetLabel: 'As in the rig document' }, makerOf(context)),
    );
    const rig = await load(context, rigId);
    await services.stations.put(rig);
    return rigViewOf(services, rig);
  }),
];

const readRoutes = [
  mount(contracts.getRig, async (context) => {
    const rig = await load(context, context.params.rigId);
    context.setEtag(rigTag(context.services, rig));
    return rigViewOf(context.services, rig);
  }),
];

const reviseRoutes = [
  mount(contracts.reviseRig, async (context) => {
    const { body, membership, params, services, ifMatch } = context;
    const before = await load(context, params.rigId);
    if (!knowsRevision(ifMatch, before)) throw await revisedMeanwhile(context, before);
    await assertFree(services, before);
    if (services.guided.isMoving(before.id))
      throw new ProblemError('rig-busy', `${before.name} is being moved. Wait until it stands still, then make the revision.`);
    const entry = {
      kind: 'rig.revised',
      data: (done: boolean) => ({ rigId: before.id, from: before.revision, to: done ? before.revision + 1 : null, reason: body.reason }),
    };
    const revision = { labId: membership.labId, rigId: before.id, expectedRevision: before.revision, ...body };
    const done = await audited(context, entry, async (tx) => {
      if (!(await store.reviseRig(tx, revision, makerOf(context)))) throw await revisedMeanwhile(context, await load(context, before.id));
      return true;
    });
    const rig = await load(context, before.id);
    if (done) {
      services.reviews.drop(rig.id);
      await services.stations.put(rig);
    }
    services.guided.revised(rig.id, rig.document);
    context.setEtag(rigTag(context.services, rig));
    return rigViewOf(services, rig);
  }),
];

const revisionRoutes = [
  mount(contracts.listRigRevisions, async (context) => {
    const rig = await load(context, context.params.rigId);
    const revisions = await store.listRigRevisions(context.services.database.db, rig.labId, rig.id);
    return {
      items: revisions.map(({ number, madeAt, madeBy, reason, document }) => ({ number, at: isoOf(madeAt), by: madeBy, reason, document })),
    };
  }),
];

async function revisedMeanwhile(
  { services, membership }: Pick<Caller, 'services' | 'membership'>,
  rig: store.RigRecord,
): Promise<ProblemError> {
  const [newest] = await store.listRigRevisions(services.database.db, membership.labId, rig.id);
  const who = newest === undefined ? 'Somebody' : newest.madeBy;
  return new ProblemError(
    'edited-meanwhile',
    `${who} made revision ${String(rig.revision)} of ${rig.name} after you opened it${newest === undefined ? '' : ` ("${newest.reason}", ${isoOf(newest.madeAt)})`}. Open that revision and make your change there.`,
  );
}

const linkRoutes = [
  mount(contracts.changeLink, async (context) => {
    const { body, params, services, ifMatch } = context;
    const before = await load(context, params.rigId);
    if (!knowsLink(services, ifMatch, before))
      throw new ProblemError(
        'edited-meanwhile',
        `Somebody chose another line for ${before.name} after you opened this page. Look at it as it is now, then choose yours.`,
      );
    await assertUntouched(services, before);
    const entry = { kind: 'rig.link-changed', data: () => ({ rigId: before.id, from: before.link, to: body }) };
    await audited(context, entry, (tx) =>
      store.changeRigLink(tx, { labId: before.labId, rigId: before.id, settings: body }, makerOf(context)),
    );
    const rig = await load(context, before.id);
    await services.stations.put(rig);
    context.setEtag(rigTag(services, rig));
    return rigViewOf(services, rig);
  }),

  mount(contracts.tryLink, async (context) => {
    const rig = await load(context, context.params.rigId);
    await assertUntouched(context.services, rig);
    const answer = await context.services.stations.tryLine(rig, context.body);
    auditLater(context, 'rig.link-tried', { rigId: rig.id, with: context.body, ok: answer.ok });
    return answer;
  }),
];

const massSetRoutes = [
  mount(contracts.addMassSet, async (context) => {
    const { body, params, services } = context;
    const rig = await load(context, params.rigId);
    const entry = { kind: 'rig.mass-set-added', data: () => ({ rigId: rig.id, label: body.label }) };
    return audited(context, entry, async (tx) => {
      const massSet = await store.addMassSet(tx, { labId: rig.labId, rigId: rig.id, ...body, createdAt: services.clock.utcMs() });
      if (massSet === null)
        throw new ProblemError('already-exists', `${rig.name} has a mass set called "${body.label}" already. Choose another label.`, [
          { path: 'label', message: 'a label of its own' },
        ]);
      return massSet;
    });
  }),
];

const checkRoutes = [
  mount(contracts.startChecks, async (context) => {
    const { query, params, me, membership, services } = context;
    const rig = await load(context, params.rigId);
    const revision = await findRevision(services.database.db, { labId: membership.labId, protocolId: query.protocolId }, query.revision);
    if (revision === null) throw notFound('protocol revision');
    const report = await makeStartChecks(services, {
      rig,
      document: rig.document,
      protocol: revision.document,
      timeZone: membership.timeZone,
      userId: me.userId,
    });
    return {
      checks: report.checks,
      mayStart: report.mayStart,
      durationS: report.durationS,
      finishAt: isoOf(report.finishUtcMs),
      firstMove: report.firstMove,
    };
  }),
];

export const rigRoutes = [
  ...revisionRoutes,
  ...massSetRoutes,
  ...atTheRig('each', listRoutes),
  ...atTheRig(anyRig, makeRoutes),
  ...atTheRig(rigOfAddress, readRoutes, { urgent: true, elseStored: true }),
  ...atTheRig(rigOfAddress, checkRoutes, { urgent: true }),
  ...atTheRig(rigOfAddress, [...reviseRoutes, ...linkRoutes]),
];
