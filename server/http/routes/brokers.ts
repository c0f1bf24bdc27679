import * as contracts from '@/shared/contracts/brokers';
import type { BrokerStatus, BrokerView } from '@/shared/contracts/brokers';
import * as store from '@/server/store/brokers';
import { audited } from '../audited';
import { isoOf } from '../maker';
import { notFound } from '../problem-error';
import { mount } from '../route-context';
import { assertRig, makeStreamChannels } from './devices';

/** A server that has told nothing for so long listens no more, ms. */
const SILENT_MS = 60_000;

function statusOf(status: BrokerStatus | null, nowUtcMs: number): BrokerStatus | null {
  if (status === null || nowUtcMs - Date.parse(status.toldAt) < SILENT_MS) return status;
  return { ...status, state: 'away', since: status.toldAt, reason: 'the server that drives this rig has told nothing since' };
}

const viewOf = (broker: store.BrokerRecord, nowUtcMs: number): BrokerView => ({
  id: broker.id,
  address: broker.address,
  signsIn: broker.userName !== null,
  topics: broker.topics,
  madeAt: isoOf(broker.madeAt),
  madeBy: broker.madeBy,
  status: statusOf(broker.status, nowUtcMs),
});

export const brokerRoutes = [
  mount(contracts.listBrokers, async ({ params, membership, services }) => {
    const rig = { labId: membership.labId, rigId: params.rigId };
    await assertRig(services, rig);
    return { items: (await store.brokersOf(services.database.db, rig)).map((broker) => viewOf(broker, services.clock.utcMs())) };
  }),

  mount(contracts.addBroker, async (context) => {
    const { params, membership, services, body, me } = context;
    const rig = { labId: membership.labId, rigId: params.rigId };
    await assertRig(services, rig);
    const madeAt = services.clock.utcMs();
    const entry = {
      kind: 'broker.added',
      data: ({ id, address, topics }: store.BrokerRecord) => ({ rigId: rig.rigId, brokerId: id, address, topics }),
    };
    const wanted = body.topics.map(({ channel }) => channel);
    const made = await audited(context, entry, async (tx) => {
      await makeStreamChannels(tx, { ...rig, createdAt: madeAt }, { wanted, pathOf: (index) => `topics.${String(index)}.channel.name` });
      return store.insertBroker(tx, { ...rig, ...body, madeAt, madeBy: me.name });
    });
    return viewOf(made, madeAt);
  }),

  mount(contracts.removeBroker, async (context) => {
    const { params, membership, services, me } = context;
    const rig = { labId: membership.labId, rigId: params.rigId };
    await assertRig(services, rig);
    const entry = {
      kind: 'broker.removed',
      data: ({ id, address }: store.BrokerRecord) => ({ rigId: rig.rigId, brokerId: id, address }),
    };
    await audited(context, entry, async (tx) => {
      const removed = await store.removeBroker(tx, { ...rig, id: params.brokerId, at: services.clock.utcMs(), by: me.name });
      if (removed === null) throw notFound('broker');
      return removed;
    });
    return undefined;
  }),
];
