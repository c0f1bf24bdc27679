import * as contracts from '@/shared/contracts/doors';
import type { DoorCard } from '@/shared/contracts/doors';
import { calleesOf } from '@/shared/alarms/rings';
import { callMembersOf, callSettingsOf } from '@/server/store/calls';
import * as store from '@/server/store/doors';
import { findRig } from '@/server/store/rigs';
import { activeRuns } from '@/server/store/runs-read';
import { audited } from '../audited';
import { atTheRig } from '../desk/at-the-rig';
import { calendarOf } from '../calendar';
import { isoOf, isoOrNull } from '../maker';
import { originForLinks } from '../origin';
import { notFound } from '../problem-error';
import { mount, type RouteContext } from '../route-context';
import type { Services } from '../services';

const weekMs = 7 * 86_400_000;

async function assertRig(services: Services, rig: { labId: string; rigId: string }): Promise<void> {
  if ((await findRig(services.database.db, rig.labId, rig.rigId)) === null) throw notFound('rig');
}

/** What keeps people out, the most pressing first. */
async function standOf(services: Services, { labId, rigId }: store.DoorAtAddress): Promise<Pick<DoorCard, 'state' | 'untilAt'>> {
  const run = (await activeRuns(services.database.db, labId)).get(rigId);
  if (run !== undefined) return { state: 'run', untilAt: isoOrNull(run.predictedEndAt) };
  const arm = services.arms.armOf(rigId);
  if (arm !== null) return { state: 'armed', untilAt: isoOf(arm.untilUtcMs) };
  return { state: services.locks.locksOf(rigId).length > 0 ? 'hands' : 'free', untilAt: null };
}

const namedAtMost = 3;

async function onCallOf({ database: { db } }: Services, { labId, rigId }: store.DoorAtAddress): Promise<string[]> {
  const run = (await activeRuns(db, labId)).get(rigId);
  const callees = calleesOf(await callSettingsOf(db, labId), await callMembersOf(db, labId), run?.startedById ?? null);
  return callees.slice(0, namedAtMost).map(({ name }) => name);
}

async function cardOf(services: Services, door: store.DoorAtAddress): Promise<DoorCard> {
  const { labId, labName, rigId, rigName, timeZone, ring } = door;
  const nowUtcMs = services.clock.utcMs();
  const span = { labId, rigId, timeZone, fromUtcMs: nowUtcMs, untilUtcMs: nowUtcMs + weekMs };
  const next = (await calendarOf(services.database.db, span)).find(({ state }) => state === 'planned');
  return {
    ...{ labName, rigName, timeZone, ring, ...(await standOf(services, door)), nextAt: next?.dueAt ?? null },
    onCall: await onCallOf(services, door),
    serverAt: isoOf(nowUtcMs),
  };
}

const deedRoutes = [
  mount(contracts.readDoor, async ({ params, membership, services }) => {
    const rig = { labId: membership.labId, rigId: params.rigId };
    await assertRig(services, rig);
    const door = await store.findDoor(services.database.db, rig);
    return { ring: door?.ring ?? '', madeAt: isoOrNull(door?.madeAt ?? null) };
  }),

  mount(contracts.makeDoor, async (context) => {
    const { params, membership, services, body, req } = context;
    const rig = { labId: membership.labId, rigId: params.rigId };
    await assertRig(services, rig);
    const token = services.newToken();
    const door = { ...rig, ring: body.ring, madeAt: services.clock.utcMs() };
    const entry = { kind: 'door-card.made', data: () => ({ rigId: rig.rigId }) };
    await audited(context, entry, (tx) => store.putDoor(tx, { ...door, tokenHash: services.sha256(token) }));
    return { address: `${originForLinks(req, services.config)}/doors/${token}`, ring: door.ring, madeAt: isoOf(door.madeAt) };
  }),

  mount(contracts.endDoor, async (context) => {
    const { params, membership, services } = context;
    const rig = { labId: membership.labId, rigId: params.rigId };
    await assertRig(services, rig);
    await audited(context, { kind: 'door-card.ended', data: () => ({ rigId: rig.rigId }) }, (tx) => store.deleteDoor(tx, rig));
    return undefined;
  }),
];

const cardRoutes = [
  mount(contracts.doorCard, async ({ params, services }) => {
    const door = await store.doorAt(services.database.db, services.sha256(params.token));
    if (door === null) throw notFound('door card');
    return cardOf(services, door);
  }),
];

const rigOfCard = async ({ params, services }: RouteContext) =>
  store.doorAt(services.database.db, services.sha256((params as { token?: string }).token ?? ''));

export const doorRoutes = [...deedRoutes, ...atTheRig(rigOfCard, cardRoutes, { urgent: true, elseStored: true })];
