import * as contracts from '@/shared/contracts/calls';
import type { OnCall, PushDevice, WatcherView } from '@/shared/contracts/calls';
import { calleesOf } from '@/shared/alarms/rings';
import { auditInAllLabs } from '@/server/auth/sign-in';
import { RefusedAddress } from '@/server/interfaces/outgoing';
import { checkedUrl } from '@/server/notify/outgoing';
import { tellPerson } from '@/server/notify/tell';
import * as store from '@/server/store/calls';
import { countPushDevices, pushDevicesOf, putPushDevice, removePushDevice, type PushDeviceRecord } from '@/server/store/push-devices';
import { countUse } from '@/server/store/rate-limits';
import { audited, auditLater } from '../audited';
import { isoOf, isoOrNull } from '../maker';
import { notFound, ProblemError } from '../problem-error';
import { mount } from '../route-context';
import type { Services } from '../services';
import { sendSign } from '../work/signs-of-life';

async function onCallOf({ database: { db } }: Services, labId: string, userId: string): Promise<OnCall> {
  const settings = await store.callSettingsOf(db, labId);
  const members = await store.callMembersOf(db, labId);
  const devices = await countPushDevices(
    db,
    members.map((member) => member.userId),
  );
  return {
    settings,
    members: members.map(({ email: _email, ...member }) => ({ ...member, devices: devices.get(member.userId) ?? 0 })),
    order: calleesOf(settings, members, userId).map(({ userId: id, name }) => ({ userId: id, name })),
    own: { doNotRing: members.find((member) => member.userId === userId)?.doNotRing ?? null },
  };
}

const trialRate = { name: 'call-trial', limit: 10, windowS: 3600 };

const calling = [
  mount(contracts.getOnCall, ({ membership, me, services }) => onCallOf(services, membership.labId, me.userId)),

  mount(contracts.changeOnCall, async (context) => {
    const { membership, me, services, body } = context;
    const { labId } = membership;
    const members = await store.callMembersOf(services.database.db, labId);
    const stranger = body.order.findIndex(({ userId }) => !members.some((member) => member.userId === userId));
    if (stranger >= 0)
      throw new ProblemError('invalid-input', 'The order names somebody who is no member of the lab.', [
        { path: `order.${String(stranger)}.userId`, message: 'a member of the lab' },
      ]);
    await audited(context, { kind: 'lab.on-call-changed', data: () => ({ ...body }) }, (tx) => store.putCallSettings(tx, labId, body));
    return onCallOf(services, labId, me.userId);
  }),

  mount(contracts.changeOwnCall, async (context) => {
    const { membership, me, body } = context;
    const who = { labId: membership.labId, userId: me.userId };
    await audited(context, { kind: 'member.do-not-ring-changed', data: () => ({ ...body }) }, (tx) => store.putOwnCall(tx, who, body));
    return body;
  }),

  mount(contracts.tryCall, async (context) => {
    const { me, membership, services, res } = context;
    const nowUtcMs = services.clock.utcMs();
    const seconds = await countUse(services.database.db, trialRate, { subject: services.sha256(me.userId), nowUtcMs });
    if (seconds !== null) {
      res.set('Retry-After', String(seconds));
      throw new ProblemError('too-many-requests', `Ten trials an hour are enough. Try again in ${String(Math.ceil(seconds / 60))} min.`);
    }
    const message = {
      title: `Trial: ${membership.labName}`,
      paragraphs: ['This is how an alarm would reach you. Nothing is wrong.'],
      ...{ path: '/alarms', tag: 'trial', quiet: false },
    };
    const items = await tellPerson(services.tell, { userId: me.userId, email: me.email }, message);
    auditLater(context, 'member.trial-sent', { outcomes: items.map(({ means, outcome }) => `${means}: ${outcome}`) });
    return { items };
  }),
];

const watcherViewOf = ({ signUrl, signAt, signOk, signDetail }: store.WatcherState): WatcherView => ({
  ...{ url: signUrl, ok: signOk, detail: signDetail },
  lastAt: isoOrNull(signAt),
});

/** @throws ProblemError for an address to which nothing is sent */
function assertAddress(url: string, field: string, services: Services): void {
  try {
    checkedUrl(url, services.config.privateHosts);
  } catch (error) {
    if (!(error instanceof RefusedAddress)) throw error;
    throw new ProblemError('invalid-input', error.message, [{ path: field, message: error.message }]);
  }
}

const watching = [
  mount(contracts.getWatcher, async ({ membership, services }) =>
    watcherViewOf(await store.watcherOf(services.database.db, membership.labId)),
  ),

  mount(contracts.changeWatcher, async (context) => {
    const { membership, services, body } = context;
    const { labId } = membership;
    if (body.url !== null) assertAddress(body.url, 'url', services);
    // The address may hold a secret of the watcher; the chain says only where it leads.
    const data = () => ({ host: body.url === null ? null : new URL(body.url).host });
    await audited(context, { kind: 'lab.watcher-changed', data }, (tx) => store.putWatcher(tx, labId, body.url));
    if (body.url !== null) await sendSign(services, { labId, url: body.url });
    return watcherViewOf(await store.watcherOf(services.database.db, labId));
  }),
];

const deviceViewOf = ({ id, device, madeAt, lastSentAt }: PushDeviceRecord): PushDevice => ({
  ...{ id, device },
  madeAt: isoOf(madeAt),
  lastSentAt: isoOrNull(lastSentAt),
});

const pushing = [
  mount(contracts.getPushKey, async ({ services }) => ({ publicKey: await services.push.publicKey() })),

  mount(contracts.listPushDevices, async ({ me, services }) => ({
    items: (await pushDevicesOf(services.database.db, me.userId)).map(deviceViewOf),
  })),

  mount(contracts.addPushDevice, async ({ me, body, services }) => {
    assertAddress(body.endpoint, 'endpoint', services);
    const { endpoint, keys, device } = body;
    const wanted = { userId: me.userId, endpoint, ...keys, device, madeAt: services.clock.utcMs() };
    return services.database.db.transaction(async (tx) => {
      const put = await putPushDevice(tx, wanted);
      if (put.isNew)
        await auditInAllLabs(tx, { user: { id: me.userId, name: me.name }, kind: 'person.device-added', data: { device } }, services);
      return deviceViewOf(put);
    });
  }),

  mount(contracts.removePushDevice, async ({ me, params, services }) => {
    return services.database.db.transaction(async (tx) => {
      const device = await removePushDevice(tx, { userId: me.userId, id: params.deviceId });
      if (device === null) throw notFound('device');
      await auditInAllLabs(tx, { user: { id: me.userId, name: me.name }, kind: 'person.device-removed', data: { device } }, services);
      return undefined;
    });
  }),
];

export const callRoutes = [...calling, ...watching, ...pushing];
