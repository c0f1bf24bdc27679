import * as contracts from '@/shared/contracts/brokers';
import type { BrokerStatus, BrokerView } from '@/shared/contracts/brokers';
import * as store from '@/server/store/brokers';
import { audited } from '../audited';
import { certificateFault } from '@/server/ingest/certificates';
import { sealedPassword } from '../kept-password';
import { isoOf } from '../maker';
import { notFound, ProblemError } from '../problem-error';
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
  ca: broker.ca,
  topics: broker.topics,
  madeAt: isoOf(broker.madeAt),
  madeBy: broker.madeBy,
  status: statusOf(broker.status, nowUtcMs),
});

const wrong = (path: string, message: string) => new ProblemError('invalid-input', message, [{ path, message }]);

/** @throws ProblemError where it is none, or where nothing is proved by it */
function assertCertificate({ address, ca }: { address: string; ca?: string | null | undefined }): void {
  if (ca == null) return;
  if (!address.startsWith('mqtts:')) throw wrong('ca', 'A certificate counts with TLS alone: begin the address with mqtts://.');
  const fault = certificateFault(ca);
  if (fault !== null) throw wrong('ca', fault);
}

/** A password never goes to an address that it was not given for. */
function assertSignIn(before: store.BrokerRecord, address: string): void {
  if (before.userName !== null && before.address !== address)
    throw wrong('signIn', 'The address is another one: give name and password again, or say that it asks for none.');
}

const pathOf = (index: number) => `topics.${String(index)}.channel.name`;

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
    assertCertificate(body);
    const madeAt = services.clock.utcMs();
    const entry = {
      kind: 'broker.added',
      data: ({ id, address, topics }: store.BrokerRecord) => ({ rigId: rig.rigId, brokerId: id, address, topics }),
    };
    const wanted = body.topics.map(({ channel }) => channel);
    const made = await audited(context, entry, async (tx) => {
      await makeStreamChannels(tx, { ...rig, createdAt: madeAt }, { wanted, pathOf });
      const password = sealedPassword(services, { of: 'broker', ...rig }, body.password);
      return store.insertBroker(tx, { ...rig, ...body, ca: body.ca ?? null, password, madeAt, madeBy: me.name });
    });
    return viewOf(made, madeAt);
  }),

  mount(contracts.reviseBroker, async (context) => {
    const { params, membership, services, body } = context;
    const rig = { labId: membership.labId, rigId: params.rigId };
    assertCertificate(body);
    const { address, topics, signIn } = body;
    const nowUtcMs = services.clock.utcMs();
    const entry = {
      kind: 'broker.revised',
      data: (broker: store.BrokerRecord) => ({
        rigId: rig.rigId,
        brokerId: broker.id,
        address,
        topics,
        signsInAnew: signIn !== 'as-before',
      }),
    };
    const revised = await audited(context, entry, async (tx) => {
      const before = await store.lockBroker(tx, { ...rig, id: params.brokerId });
      if (before === null) throw notFound('broker');
      if (signIn === 'as-before') assertSignIn(before, address);
      await makeStreamChannels(tx, { ...rig, createdAt: nowUtcMs }, { wanted: topics.map(({ channel }) => channel), pathOf });
      const given =
        signIn === 'as-before'
          ? { userName: before.userName, password: before.password }
          : { userName: signIn.userName, password: sealedPassword(services, { of: 'broker', ...rig }, signIn.password) };
      return store.reviseBroker(tx, before, { ...given, address, topics, ca: body.ca ?? null });
    });
    return viewOf(revised, nowUtcMs);
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
