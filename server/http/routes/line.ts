import * as contracts from '@/shared/contracts/link';
import { homeSpeedDegS } from '@/shared/protocol/durations';
import type { RigMotion } from '@/shared/rig/document';
import { travelWithTurns } from '@/shared/rig/travel';
import { GuidedRefused, type MoveRequest, type GuidedRig } from '@/server/engine/guided-orders';
import type { ControllerLimits } from '@/server/interfaces/turntable-link';
import { findRig, listRigs, type RigRecord } from '@/server/store/rigs';
import { auditLater, audited } from '../audited';
import { assertFreshTap } from '../begin-run';
import { anyRig, atTheRig, rigOfAddress } from '../desk/at-the-rig';
import { guidedViewOf, limitsViewOf } from '../line-view';
import { isoOf } from '../maker';
import { notFound, ProblemError } from '../problem-error';
import { mount, type Membership, type SignedIn } from '../route-context';
import type { Services } from '../services';
import { knowsRevision } from '../rig-view';
import { assertSigned } from './arming';

type Caller = { me: SignedIn; membership: Membership; services: Services };

async function load({ membership, services }: Pick<Caller, 'membership' | 'services'>, rigId: string): Promise<RigRecord> {
  const rig = await findRig(services.database.db, membership.labId, rigId);
  if (rig === null) throw notFound('rig');
  return rig;
}

/** The motion that a guided move goes by. */
function guidedRig(rig: RigRecord): GuidedRig {
  const { motion } = rig.document;
  if (motion === undefined)
    throw new ProblemError(
      'not-ready',
      `The document of ${rig.name} has no motion data. Enter steps per degree and limits as the drive's data sheet gives them; the first move then measures them.`,
    );
  return { labId: rig.labId, rigId: rig.id, name: rig.name, document: rig.document, motion };
}

/** Runs a piece of the engine and says its refusals as problems. */
function engine<T>(act: () => T): T {
  try {
    return act();
  } catch (error) {
    if (!(error instanceof GuidedRefused)) throw error;
    throw new ProblemError(error.code, error.message, error.field === undefined ? [] : [{ path: error.field, message: error.message }]);
  }
}

const asked = (context: { me: SignedIn; params: { rigId: string } }, guidedId: string) => ({
  rigId: context.params.rigId,
  sessionId: guidedId,
  userId: context.me.userId,
});

type OrderContext = Caller & { params: { rigId: string } };

/** Says who orders what in the audit chain, then orders it: what sets something in motion is saved first. */
async function give(context: OrderContext, body: { guidedId: string; tappedAt: string }, order: MoveRequest) {
  const { services } = context;
  const assertFresh = () => void assertFreshTap(body.tappedAt, services.clock.utcMs(), order.kind === 'home' ? 'home' : 'nudge');
  const rig = await load(context, context.params.rigId);
  assertFresh();
  const who = asked(context, body.guidedId);
  engine(() => services.guided.assertMayOrder(who, order));
  const entry = { kind: order.kind === 'home' ? 'rig.home-asked' : 'rig.nudge-asked', data: () => ({ rigId: rig.id, ...order }) };
  await audited(context, entry, async () => undefined);
  assertFresh();
  return guidedViewOf(
    services,
    engine(() => services.guided.order(who, order)),
  );
}

const streamRoutes = [
  mount(contracts.liveLine, async ({ params, membership, me, services, res }) => {
    const { labId } = membership;
    const place = { labId, rigId: params.rigId };
    if (services.outlook.line(place) === null) {
      await load({ membership, services }, params.rigId);
      await services.outlook.follow(place);
    }
    if (services.outlook.line(place) === null) {
      throw new ProblemError(
        'not-found',
        'This server has no line to that rig: its document has no motion data, or another server drives it.',
      );
    }
    services.lines.open(res, { labId, rigId: params.rigId, me });
    return undefined;
  }),
];

const portRoutes = [
  mount(contracts.listSerialPorts, async ({ membership, services }) => {
    const [ports, rigs] = await Promise.all([services.stations.listPorts(), listRigs(services.database.db, membership.labId)]);
    const userOf = (names: (string | null)[]) => rigs.find(({ link }) => link.kind === 'serial' && names.includes(link.path))?.name ?? null;
    return { items: ports.map((port) => ({ ...port, usedBy: userOf([port.path, port.stablePath]) })) };
  }),
];

const guidedRoutes = [
  mount(contracts.beginGuided, async (context) => {
    const { me, services } = context;
    const record = await load(context, context.params.rigId);
    const rig = guidedRig(record);
    await assertSigned(context, record);
    engine(() => services.guided.assertMayBegin(rig));
    const id = services.newId();
    const arm = services.arms.armOf(rig.rigId);
    const entry = { kind: 'rig.guided-begun', data: () => ({ rigId: rig.rigId, guidedId: id, arm: arm?.name ?? null }) };
    await audited(context, entry, async () => undefined);
    const session = engine(() => services.guided.begin(rig, { id: me.userId, name: me.name }, id));
    services.background(services.access.refresh(services.watchedLabs()), 'copying sessions into memory');
    return guidedViewOf(services, session);
  }),

  mount(contracts.endGuided, async (context) => {
    const { params, body, services } = context;
    const rig = await load(context, params.rigId);
    services.guided.end(rig.id, body.guidedId);
    auditLater(context, 'rig.guided-ended', { rigId: rig.id, guidedId: body.guidedId });
    return undefined;
  }),
];

const stayRoutes = [
  mount(contracts.stayGuided, async (context) => {
    const { params, body, membership, services } = context;
    if (services.stations.get(params.rigId)?.labId !== membership.labId) await load(context, params.rigId);
    engine(() => services.guided.seen(asked(context, body.guidedId), body.beat));
    return undefined;
  }),
];

const orderRoutes = [
  mount(contracts.nudge, (context) => {
    const { steps, intoKeepOut } = context.body;
    return give(context, context.body, { kind: 'nudge', steps, intoKeepOut });
  }),

  mount(contracts.homeByHand, (context) => give(context, context.body, { kind: 'home', intoKeepOut: context.body.intoKeepOut })),
];

const limitsOfDocument = (motion: RigMotion): ControllerLimits => ({
  ...travelWithTurns(motion),
  maxSpeedDegS: motion.maxSpeed_deg_s,
  maxAccelerationDegS2: motion.maxAcceleration_deg_s2,
  homeSpeedDegS: homeSpeedDegS(motion),
});

const teachRoutes = [
  mount(contracts.teachLimits, async (context) => {
    const { body, params, services, ifMatch } = context;
    const rig = await load(context, params.rigId);
    assertFreshTap(body.tappedAt, services.clock.utcMs(), 'write the limits');
    if (!knowsRevision(ifMatch, rig))
      throw new ProblemError(
        'edited-meanwhile',
        `${rig.name} has another revision than the one you looked at. Look at its limits again, then write them.`,
      );
    const { motion } = guidedRig(rig);
    const who = asked(context, body.guidedId);
    engine(() => services.guided.assertMayOrder(who, { kind: 'teach' }));
    const limits = limitsOfDocument(motion);
    await audited(
      context,
      { kind: 'rig.limits-asked', data: () => ({ rigId: rig.id, revision: rig.revision, limits }) },
      async () => undefined,
    );
    const outcome = await engine(() => services.guided.teach(who, limits));
    if (!outcome.taught)
      throw new ProblemError(
        outcome.code === 'key' ? 'not-ready' : 'not-possible-now',
        `The controller did not take the limits: ${outcome.message}.`,
      );
    auditLater(context, 'rig.limits-taught', { rigId: rig.id, revision: rig.revision, limits: outcome.limits });
    return { limits: limitsViewOf(outcome.limits) };
  }),
];

/** Hold and stop of whatever moves: its run where there is one, else the turntable itself. Nothing here waits for the database. */
async function haltRig(context: OrderContext, kind: 'hold' | 'stop') {
  const { params, me, membership, services } = context;
  const { rigId } = params;
  const station = services.stations.get(rigId);
  if (station?.labId !== membership.labId) {
    await load(context, rigId);
    throw new ProblemError('not-possible-now', 'This server has no line to that rig. Use the switch at the rig if anything moves.');
  }
  const driver = services.supervisor.activeOf(rigId);
  auditLater(context, `rig.${kind}-asked`, { rigId });
  if (driver !== null && !driver.isOver()) {
    const answer = driver[kind](me.name);
    if (answer.ok) return { rigId, serverAt: isoOf(answer.serverAtUtcMs) };
  }
  const halt = services.guided.halt({ labId: station.labId, rigId }, kind, { id: me.userId, name: me.name });
  if (halt === null)
    throw new ProblemError('not-possible-now', 'The line of the rig was closed this very moment. Use the switch at the rig.');
  return { rigId, serverAt: isoOf(halt.serverAtUtcMs) };
}

const haltRoutes = [
  mount(contracts.holdRig, (context) => haltRig(context, 'hold')),
  mount(contracts.stopRig, (context) => haltRig(context, 'stop')),
];

const takeOverRoutes = [
  mount(contracts.takeController, async (context) => {
    const { body, params, membership, services } = context;
    const rig = await load(context, params.rigId);
    const keptOutBy = services.stations.get(rig.id)?.link.health().higherEpoch ?? null;
    if (keptOutBy !== body.keptOutBy)
      throw new ProblemError(
        'not-possible-now',
        keptOutBy === null
          ? 'The controller is not kept from this server at the moment: there is nothing to take over.'
          : `The controller obeys number ${keptOutBy} now, not ${body.keptOutBy}: another server may be driving it at this moment. Look again.`,
      );
    await audited(context, { kind: 'rig.controller-taken-over', data: () => ({ rigId: rig.id, keptOutBy }) }, async () => undefined);
    const number = await services.stations.takeController({ labId: membership.labId, rigId: rig.id }, keptOutBy);
    if (number === null) throw new ProblemError('not-possible-now', 'This server does not drive the rig at the moment.');
    return { number };
  }),
];

export const lineRoutes = [
  ...streamRoutes,
  ...atTheRig(anyRig, portRoutes, { urgent: true }),
  ...atTheRig(rigOfAddress, [...takeOverRoutes, ...guidedRoutes, ...orderRoutes, ...teachRoutes]),
  ...atTheRig(rigOfAddress, [...stayRoutes, ...haltRoutes], { urgent: true }),
];
