import type { Request } from 'express';
import * as contracts from '@/shared/contracts/devices';
import type { DeviceTokenView, StreamChannel } from '@/shared/contracts/devices';
import { MOST_PROBLEMS, readNdjson, type LineProblem, type ReadSamples } from '@/server/ingest/read-ndjson';
import type { Transaction } from '@/server/store/database';
import * as store from '@/server/store/device-tokens';
import { channelsOfRig, findOrMakeChannel, type ChannelRecord } from '@/server/store/imports';
import { thinnedOfLab } from '@/server/store/retention';
import { findRig } from '@/server/store/rigs';
import { ThinnedSamplesError } from '@/server/store/thinned-error';
import { lastSampleUtcMs } from '@/server/store/sample-summaries';
import { audited } from '../audited';
import { bearerOf, boundedBody } from '../device-request';
import { isoOf, isoOrNull } from '../maker';
import { notFound, ProblemError } from '../problem-error';
import { mount } from '../route-context';
import type { Services } from '../services';
import { channelViewOf } from './data';

const viewOf = (token: store.DeviceTokenRecord): DeviceTokenView => ({
  id: token.id,
  name: token.name,
  channels: token.channels,
  madeAt: isoOf(token.madeAt),
  madeBy: token.madeBy,
  lastUsedAt: isoOrNull(token.lastUsedAt),
  revokedAt: isoOrNull(token.revokedAt),
});

export async function assertRig(services: Services, rig: { labId: string; rigId: string }): Promise<void> {
  if ((await findRig(services.database.db, rig.labId, rig.rigId)) === null) throw notFound('rig');
}

const ofRig = (channel: ChannelRecord) => channel.runId === null;

/** Why the channel that is there already cannot be filled by the device; null where it can. */
function misfit(channel: ChannelRecord, wanted: StreamChannel): string | null {
  if (channel.source === 'simulated') return 'is filled by the rig itself';
  if (channel.source === 'import') return 'was brought in as a file';
  if (channel.unit !== wanted.unit) return `is in ${channel.unit}, not in ${wanted.unit}`;
  return channel.role === wanted.role ? null : `is one of the ${channel.role}`;
}

const quantityOf = ({ role, unit, name }: StreamChannel) =>
  role === 'environment' ? name : unit.endsWith('rad') ? 'pendulum angle' : 'spot position';

/**
 * Finds or makes the channels that something outside is to fill.
 * @throws ProblemError where one is there that it cannot fill
 */
export async function makeStreamChannels(
  tx: Transaction,
  rig: { labId: string; rigId: string; createdAt: number },
  { wanted, pathOf }: { wanted: readonly StreamChannel[]; pathOf: (index: number) => string },
): Promise<void> {
  for (const [index, channel] of wanted.entries()) {
    const facts = { ...channel, ...rig, runId: null, quantity: quantityOf(channel), source: 'stream' as const };
    const why = misfit(await findOrMakeChannel(tx, facts), channel);
    if (why !== null)
      throw new ProblemError('already-exists', `The channel ${channel.name} of this rig ${why}. Choose another name for the new one.`, [
        { path: pathOf(index), message: 'another name' },
      ]);
  }
}

const deviceRoutesOfLab = [
  mount(contracts.listDevices, async ({ params, membership, services }) => {
    const rig = { labId: membership.labId, rigId: params.rigId };
    await assertRig(services, rig);
    const { db } = services.database;
    const streams = (await channelsOfRig(db, rig.labId, rig.rigId)).filter((channel) => ofRig(channel) && channel.source === 'stream');
    const thinned = await thinnedOfLab(db, rig.labId);
    const last = await Promise.all(streams.map(({ id }) => lastSampleUtcMs(services.database, { labId: rig.labId, channelId: id })));
    return {
      tokens: (await store.deviceTokensOf(db, rig)).map(viewOf),
      channels: streams.map((channel, index) => ({
        channel: channelViewOf(channel),
        lastSampleAt: isoOrNull(last[index] ?? null),
        thinnedToAt: isoOrNull(thinned.get(channel.id)?.toUtcMs ?? null),
      })),
    };
  }),

  mount(contracts.makeDeviceToken, async (context) => {
    const { params, membership, services, body, me } = context;
    const rig = { labId: membership.labId, rigId: params.rigId };
    await assertRig(services, rig);
    const secret = services.newToken();
    const madeAt = services.clock.utcMs();
    const entry = {
      kind: 'device-token.made',
      data: (made: store.DeviceTokenRecord) => ({ rigId: rig.rigId, tokenId: made.id, name: made.name, channels: made.channels }),
    };
    const made = await audited(context, entry, async (tx) => {
      await makeStreamChannels(
        tx,
        { ...rig, createdAt: madeAt },
        { wanted: body.channels, pathOf: (index) => `channels.${String(index)}.name` },
      );
      const channels = [...new Set(body.channels.map(({ name }) => name))];
      return store.insertDeviceToken(tx, {
        ...rig,
        name: body.name,
        tokenHash: services.sha256(secret),
        channels,
        madeAt,
        madeBy: me.name,
      });
    });
    return { token: viewOf(made), secret };
  }),

  mount(contracts.revokeDeviceToken, async (context) => {
    const { params, membership, services, me } = context;
    const rig = { labId: membership.labId, rigId: params.rigId };
    await assertRig(services, rig);
    const entry = {
      kind: 'device-token.revoked',
      data: (token: store.DeviceTokenRecord) => ({ rigId: rig.rigId, tokenId: token.id, name: token.name }),
    };
    await audited(context, entry, async (tx) => {
      const token = await store.revokeDeviceToken(tx, { ...rig, id: params.tokenId, at: services.clock.utcMs(), by: me.name });
      if (token === null) throw notFound('device token');
      return token;
    });
    return undefined;
  }),
];

async function deviceOf(services: Services, req: Request): Promise<store.DeviceTokenRecord> {
  const device = await store.deviceTokenByHash(services.database.db, services.sha256(bearerOf(req)));
  if (device === null)
    throw new ProblemError('wrong-token', 'There is no such device token, or it was revoked. Make a new one on the page of the rig.');
  return device;
}

const tooLarge = (most: number) => () =>
  new ProblemError(
    'too-large',
    `A batch has at most ${String(Math.round(most / 1024))} KiB. Send fewer lines at once; nothing was stored.`,
  );

function refusedLines(problems: readonly LineProblem[]): ProblemError {
  const items = problems.slice(0, MOST_PROBLEMS).map(({ line, message }) => ({ path: `line ${String(line)}`, message }));
  const [first] = items;
  const count = problems.length === 1 ? 'One line is' : `${String(problems.length)} lines are`;
  return new ProblemError(
    'unreadable-data',
    `Nothing was stored. ${count} wrong: ${first === undefined ? '' : `${first.path} ${first.message}`}.`,
    items,
  );
}

function takeShare(services: Services, device: store.DeviceTokenRecord, samples: number): void {
  const share = services.appendRates.take(device.id, samples);
  if (share.ok) return;
  const { batchesPerMinute, samplesPerMinute } = services.config.devices;
  throw new ProblemError(
    'too-many-requests',
    `A device may send ${String(batchesPerMinute)} batches and ${String(samplesPerMinute)} samples a minute. Nothing was stored; send the batch again in ${String(Math.ceil(share.retryAfterS))} s.`,
  ).after(share.retryAfterS);
}

type Batch = NonNullable<ReturnType<ReadSamples['batches']['get']>> & { channel: ChannelRecord };

/** The batches with the channels they go into. */
async function matched(services: Services, device: store.DeviceTokenRecord, { batches }: ReadSamples): Promise<Batch[]> {
  const channels = (await channelsOfRig(services.database.db, device.labId, device.rigId)).filter(ofRig);
  return [...batches].map(([name, batch]) => {
    const channel = channels.find((each) => each.name === name);
    if (channel === undefined) throw new Error(`the channel ${name} of a device token is gone`);
    return { ...batch, channel };
  });
}

/** The lines that came too late to be stored. */
function thinnedLines(batches: readonly Batch[], { channelId, fromUtcMs, toUtcMs }: ThinnedSamplesError): ProblemError {
  const late = batches.find(({ channel }) => channel.id === channelId);
  const lines = [...(late?.lines ?? [])].filter((_, index) => {
    const at = late?.utcMs[index] ?? NaN;
    return at >= fromUtcMs && at < toUtcMs;
  });
  return refusedLines(
    lines.map((line) => ({
      line,
      message: `lies where ${late?.channel.name ?? 'the channel'} was thinned to its summaries, up to ${isoOf(toUtcMs)}; nothing is added there`,
    })),
  );
}

async function storeAll(services: Services, device: store.DeviceTokenRecord, batches: readonly Batch[]) {
  const rows = batches.map(({ utcMs, value, channel }) => ({ utcMs, value, channelId: channel.id }));
  try {
    return await store.storeBatches(services.database, device.labId, rows);
  } catch (error) {
    if (error instanceof ThinnedSamplesError) throw thinnedLines(batches, error);
    if (!(error instanceof store.ConflictingBatchError)) throw error;
    const batch = batches.find(({ channel }) => channel.id === error.channelId);
    const line = batch?.lines[batch.utcMs.indexOf(error.atUtcMs)] ?? 0;
    throw refusedLines([
      {
        line,
        message: `has another value for ${batch?.channel.name ?? 'the channel'} than was stored for that instant; a sample is never changed`,
      },
    ]);
  }
}

const wayIn = mount(contracts.appendSamples, async ({ req, services }) => {
  const device = await deviceOf(services, req);
  const { batchBytes } = services.config.devices;
  const text = (await boundedBody(req, batchBytes, tooLarge(batchBytes))).toString('utf8');
  const read = readNdjson(text, { channels: device.channels, nowUtcMs: services.clock.utcMs() });
  const samples = [...read.batches.values()].reduce((sum, { utcMs }) => sum + utcMs.length, 0);
  takeShare(services, device, samples + read.problems.length);
  if (read.problems.length > 0) throw refusedLines(read.problems);
  const batches = await matched(services, device, read);
  const done = await storeAll(services, device, batches);
  await store.noteUse(services.database.db, device, services.clock.utcMs());
  for (const { channel, utcMs, value } of batches) services.arrived(device.rigId, { ...channel, channelId: channel.id }, { utcMs, value });
  return done;
});

export const deviceRoutes = [...deviceRoutesOfLab, wayIn];
