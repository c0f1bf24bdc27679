import * as contracts from '@/shared/contracts/data';
import type { ChannelView } from '@/shared/contracts/data';
import { calibrated } from '@/shared/statistics/calibration';
import { storeImport, tryImport, type StoredSum } from '@/server/store/import-commit';
import type { ImportRecord } from '@/server/store/import-files';
import * as store from '@/server/store/imports';
import type { Handle } from '@/server/store/database';
import { thinnedWithin } from '@/server/store/retention';
import { findRig } from '@/server/store/rigs';
import { channelsOfRun, type RunRecord } from '@/server/store/runs-read';
import { countSamples, extremesOf } from '@/server/store/sample-summaries';
import { enterAudit } from '../audited';
import { loadImport, loadRun } from '../import-file';
import { refusalOf, wantedChannel } from '../import-refusals';
import { assertMapping, checkViewOf, readImport, type ImportReading } from '../import-steps';
import { notFound, ProblemError } from '../problem-error';
import { mount } from '../route-context';
import { calibrationsOfRun } from '../run-calibrations';
import { windowOf } from '../run-window';
import type { Services } from '../services';

export const channelViewOf = (channel: store.ChannelRecord): ChannelView => ({
  id: channel.id,
  rigId: channel.rigId,
  name: channel.name,
  quantity: channel.quantity,
  unit: channel.unit,
  role: channel.role,
  source: channel.source,
  rateHz: channel.rateHz,
});

function assertReceived(file: ImportRecord): void {
  if (file.state === 'stored')
    throw new ProblemError('not-possible-now', `${file.fileName} is stored already. Begin a new import to read it in another way.`);
  if (file.state !== 'received')
    throw new ProblemError('not-possible-now', `The content of ${file.fileName} has not arrived. Send the file first.`);
}

/** What the problems of a file say when it was to be stored. */
function unreadable(file: ImportRecord, reading: ImportReading): ProblemError {
  const items = reading.problems.map(({ row, column, message }) => ({
    path: [row === null ? '' : `row ${String(row)}`, column ?? ''].filter((part) => part !== '').join(', '),
    message,
  }));
  const first = items[0];
  const words = first === undefined ? '' : [first.path, first.message].filter((part) => part !== '').join(': ');
  const count = reading.problemCount === 1 ? 'One problem' : `${String(reading.problemCount)} problems`;
  return new ProblemError('unreadable-data', `Nothing was stored. ${count} in ${file.fileName}: ${words}.`, items);
}

const namesOf = (file: ImportRecord): string[] => file.preview?.columns.map(({ name }) => name) ?? [];

export const dataRoutes = [
  mount(contracts.listChannels, async ({ params, membership, services }) => {
    const { db } = services.database;
    if ((await findRig(db, membership.labId, params.rigId)) === null) throw notFound('rig');
    const channels = await store.channelsOfRig(db, membership.labId, params.rigId);
    return { items: channels.filter((channel) => channel.runId === null).map(channelViewOf) };
  }),

  mount(contracts.checkImport, async ({ params, membership, services, body }) => {
    const file = await loadImport(services, membership.labId, params.importId);
    assertReceived(file);
    assertMapping(body.mapping);
    const run = await loadRun(services, file.labId, file.runId);
    const channel = wantedChannel(run, body, services);
    try {
      const { read, findings } = await tryImport(services.database, { channel, window: windowOf(run, services) }, (staging) =>
        readImport(services, { file, run, mapping: body.mapping }, staging),
      );
      return checkViewOf(read, findings);
    } catch (error) {
      throw refusalOf(error, body);
    }
  }),

  mount(contracts.commitImport, async (context) => {
    const { params, membership, services, body, me } = context;
    const file = await loadImport(services, membership.labId, params.importId);
    assertReceived(file);
    assertMapping(body.mapping);
    const run = await loadRun(services, file.labId, file.runId);
    const { channelName, mapping, choices } = body;
    const also = (handle: Handle, { stored, other, leftOut }: StoredSum) =>
      enterAudit(handle, context, {
        kind: 'run.data-imported',
        data: {
          ...{ runId: run.id, importId: file.id, fileName: file.fileName, sha256: file.sha256, channelName, stored },
          ...(other === 0 ? {} : { other, sameInstant: choices.sameInstant }),
          ...(leftOut === 0 ? {} : { leftOut }),
        },
      });
    const channel = wantedChannel(run, body, services);
    const key = { labId: file.labId, importId: file.id };
    try {
      const done = await storeImport(
        services.database,
        {
          ...key,
          channel,
          storedAt: channel.createdAt,
          mapping,
          columns: namesOf(file),
          by: me.name,
          window: windowOf(run, services),
          choices,
          also,
        },
        async (staging) => {
          const reading = await readImport(services, { file, run, mapping, choices }, staging);
          if (!reading.ok) throw unreadable(file, reading);
          return reading;
        },
      );
      return { ...done, channel: channelViewOf(done.channel) };
    } catch (error) {
      throw refusalOf(error, body);
    }
  }),

  mount(contracts.readSamples, async ({ params, membership, services, query }) => {
    const run = await loadRun(services, membership.labId, params.runId);
    const channels = await channelsOfRun(services.database.db, run);
    const whole = windowOf(run, services);
    const window = { fromUtcMs: query.fromUtcMs ?? whole.fromUtcMs, toUtcMs: query.toUtcMs ?? whole.toUtcMs };
    if (window.toUtcMs < window.fromUtcMs)
      throw new ProblemError('invalid-input', 'The window ends before it begins.', [{ path: 'toUtcMs', message: 'not before fromUtcMs' }]);
    const { channel, total } = await chooseChannel(services, { run, channels, window }, query.channelId);
    const known = { channel: channel === null ? null : channelViewOf(channel), channels: channels.map(channelViewOf), total };
    if (channel === null) return { ...known, utcMs: [], value: [], thinned: [], calibration: null };
    const inForce = await calibrationsOfRun(services, run, { channels: [channel], knownAtUtcMs: services.clock.utcMs() });
    const calibration = inForce.get(channel.id) ?? null;
    const view = { ...known, calibration };
    const gone = await thinnedWithin(services.database.db, { ...window, labId: run.labId, channelId: channel.id });
    const thinned = gone.map(({ fromUtcMs, toUtcMs }) => ({ fromUtcMs, toUtcMs }));
    const { utcMs, value } =
      total > query.points || thinned.length > 0
        ? await extremesOf(
            services.database,
            { ...window, labId: run.labId, channelId: channel.id },
            { cells: Math.floor(query.points / 2), total },
          )
        : await services.samples.read(run.labId, channel.id, window);
    return {
      ...view,
      thinned,
      utcMs: [...utcMs],
      value: Array.from(value, (one) => (calibration === null ? one : calibrated(calibration, one))),
    };
  }),
];

interface ChannelChoice {
  run: RunRecord;
  channels: readonly store.ChannelRecord[];
  window: { fromUtcMs: number; toUtcMs: number };
}

/** The channel asked for, else the registered one, else the first deflection channel with samples in the window. */
async function chooseChannel(
  services: Services,
  { run, channels, window }: ChannelChoice,
  channelId: string | undefined,
): Promise<{ channel: store.ChannelRecord | null; total: number }> {
  const count = (channel: store.ChannelRecord) => countSamples(services.database, { ...window, labId: run.labId, channelId: channel.id });
  if (channelId !== undefined) {
    const asked = channels.find((channel) => channel.id === channelId);
    if (asked === undefined) throw notFound('channel');
    return { channel: asked, total: await count(asked) };
  }
  const registered = run.start.protocol.evaluation?.channel;
  const deflection = channels
    .filter((channel) => channel.role === 'deflection')
    .sort((a, b) => Number(b.name === registered) - Number(a.name === registered));
  for (const channel of deflection) {
    const total = await count(channel);
    if (total > 0) return { channel, total };
  }
  return { channel: deflection[0] ?? null, total: 0 };
}
