import { and, eq } from 'drizzle-orm';
import type { PoolClient } from 'pg';
import { imports } from '@/db/schema';
import type { ImportChoices, ImportFindings, ImportMapping } from '@/shared/contracts/data';
import type { Connection, Handle } from './database';
import {
  compareStaged,
  differingRows,
  frozenDifference,
  gapsOfStaged,
  leaveOutAmong,
  refuseThinned,
  replaceDiffering,
  rowsAmongSamples,
  rowsOutside,
  type AmongStretch,
} from './import-comparison';
import { Staging } from './import-staging';
import { changeImport, rememberMapping } from './import-files';
import {
  ConflictingSamplesError,
  findNamedChannel,
  findOrMakeChannel,
  UnsuitableChannelError,
  type ChannelRecord,
  type WantedChannel,
} from './imports';
import { makeMonths, monthsOfWindow } from './sample-months';
import { assertChannel } from './sample-store';
import { tellingThinned } from './thinned-error';

/** A sample that was to be replaced lies in a run with a frozen evaluation. */
export class FrozenSamplesError extends Error {
  override readonly name = 'FrozenSamplesError';
  constructor(readonly atUtcMs: number) {
    super('a frozen evaluation stands on the sample');
  }
}

/** Rows of the file fall among samples of other instants. */
export class RowsAmongSamplesError extends Error {
  override readonly name = 'RowsAmongSamplesError';
  constructor(
    readonly rows: number,
    readonly stretch: AmongStretch,
  ) {
    super('rows of the file fall among samples of the channel');
  }
}

/** Somebody else has stored the file meanwhile. */
export class StoredMeanwhileError extends Error {
  override readonly name = 'StoredMeanwhileError';
}

/** What whoever read the file knows of it. */
export interface StagedFile {
  /** Half of the rows follow the one before at least as soon, s; null with fewer than two. */
  usualS: number | null;
  /** Rows that were taken out as was chosen. */
  leftOut: number;
}

/** Samples and rows that follow each other within ten usual intervals, 10 s at least, belong to one stretch. */
const closeS = (usualS: number | null) => Math.max(10, 10 * (usualS ?? 1));
/** A gap is longer than so many usual intervals. */
const intervalsOfGap = 5;

function assertSuitable(channel: ChannelRecord, wanted: WantedChannel): void {
  if (channel.source !== wanted.source || channel.unit !== wanted.unit) throw new UnsuitableChannelError(channel);
}

const keyOf = ({ labId, id }: ChannelRecord) => ({ labId, channelId: id });

export type StagedFindings = Omit<ImportFindings, 'outOfReach'>;

const iso = (utcMs: number) => new Date(utcMs).toISOString();

/**
 * Tells how a file would stand to its channel; stores nothing. `read` stages the rows.
 * @throws UnsuitableChannelError where the channel has another source or unit
 * @throws ThinnedSamplesError where rows lie in a time of which the summaries alone are left
 */
export async function tryImport<T extends StagedFile>(
  connection: Connection,
  work: { channel: WantedChannel; window: { fromUtcMs: number; toUtcMs: number } },
  read: (staging: Staging) => Promise<T>,
): Promise<{ read: T; findings: StagedFindings }> {
  return tellingThinned(
    connection.bulk(async (client, handle) => {
      const channel = await findNamedChannel(handle, work.channel);
      if (channel !== null) assertSuitable(channel, work.channel);
      const staging = await Staging.open(client);
      const done = await read(staging);
      if (channel !== null) await refuseThinned(client, keyOf(channel));
      return { read: done, findings: await findingsOf(client, staging, { channel, usualS: done.usualS, window: work.window }) };
    }),
  );
}

async function findingsOf(
  client: PoolClient,
  staging: Staging,
  about: { channel: ChannelRecord | null; usualS: number | null; window: { fromUtcMs: number; toUtcMs: number } },
): Promise<StagedFindings> {
  const { channel, usualS, window } = about;
  const key = channel === null ? null : keyOf(channel);
  const compared = await compareStaged(client, staging, key);
  const differs = channel !== null && compared.different > 0;
  const differing = differs ? await differingRows(client, staging, keyOf(channel)) : [];
  const apart = compared.held - compared.equal - compared.different;
  const among =
    key === null || apart === 0 ? { rows: 0, stretches: [] } : await rowsAmongSamples(client, staging, { ...key, closeS: closeS(usualS) });
  const gaps =
    usualS === null ? { count: 0, totalS: 0, longest: [] } : await gapsOfStaged(client, { longerS: intervalsOfGap * usualS, channel: key });
  return {
    ...compared,
    differing: differing.map(({ row, utcMs, stored, inFile }) => ({ row, at: iso(utcMs), stored, inFile })),
    frozen:
      differs && (await frozenDifference(client, staging, { ...keyOf(channel), rigId: channel.rigId, runId: channel.runId })) !== null,
    among: {
      rows: among.rows,
      stretches: among.stretches.map(({ fromUtcMs, toUtcMs, rows, held }) => ({ fromAt: iso(fromUtcMs), toAt: iso(toUtcMs), rows, held })),
    },
    outsideRun: await rowsOutside(client, window),
    gaps: {
      count: gaps.count,
      totalS: gaps.totalS,
      longest: gaps.longest.map(({ fromUtcMs, toUtcMs, held }) => ({ fromAt: iso(fromUtcMs), toAt: iso(toUtcMs), held })),
    },
  };
}

export interface StoredSum {
  stored: number;
  /** Instants that the channel held already, `other` of them with another value. */
  known: number;
  other: number;
  leftOut: number;
}

/**
 * Stores an import, all or nothing: `read` stages the rows and may throw, which leaves everything as it was, a channel that was not there included.
 * @throws UnsuitableChannelError where the channel has another source or unit
 * @throws ThinnedSamplesError where rows lie in a time of which the summaries alone are left
 * @throws StoredMeanwhileError where the import is stored already
 * @throws ConflictingSamplesError where an instant is known with another value and such rows are refused
 * @throws FrozenSamplesError where one of them was to be replaced and a frozen evaluation stands on it
 * @throws RowsAmongSamplesError where rows fall among samples of other instants and such rows are refused
 */
export async function storeImport(
  connection: Connection,
  work: {
    labId: string;
    importId: string;
    channel: WantedChannel;
    storedAt: number;
    mapping: ImportMapping;
    /** Names of the columns of the file, by which the mapping is found again. */
    columns: string[];
    by: string;
    choices: Pick<ImportChoices, 'sameInstant' | 'among'>;
    /** Where its samples lie most likely: partitions are made there beforehand. */
    window: { fromUtcMs: number; toUtcMs: number };
    /** What has to be written in the same transaction when all is stored. */
    also?: (handle: Handle, sum: StoredSum) => Promise<void>;
  },
  read: (staging: Staging) => Promise<StagedFile>,
): Promise<{ channel: ChannelRecord } & StoredSum> {
  const { labId, importId, channel: wanted, also, window, choices, mapping, storedAt } = work;
  await makeMonths(connection.db, monthsOfWindow(window));
  return tellingThinned(
    connection.bulk(async (client, handle) => {
      const staging = await Staging.open(client);
      const { usualS, leftOut } = await read(staging);
      await assertNotStored(handle, { labId, importId });
      const channel = await findOrMakeChannel(handle, wanted);
      assertSuitable(channel, wanted);
      await assertChannel(client, keyOf(channel));
      await refuseThinned(client, keyOf(channel));
      const done = await storeStaged(client, staging, { channel, choices, closeS: closeS(usualS) });
      const sum = { ...done, leftOut: leftOut + done.leftOut };
      await changeImport(handle, { labId, importId }, { mapping, storedAt, state: 'stored', channelId: channel.id });
      const { rigId, name: channelName } = channel;
      await rememberMapping(handle, { labId, rigId, channelName, columns: work.columns, mapping, usedAt: storedAt, usedBy: work.by });
      await also?.(handle, sum);
      return { channel, ...sum };
    }),
  );
}

/** Two who commit the same import: the second waits here and then finds it stored. */
async function assertNotStored(handle: Handle, { labId, importId }: { labId: string; importId: string }): Promise<void> {
  const [file] = await handle
    .select({ state: imports.state })
    .from(imports)
    .where(and(eq(imports.labId, labId), eq(imports.id, importId)))
    .for('update');
  if (file?.state === 'stored') throw new StoredMeanwhileError('the import is stored already');
}

async function storeStaged(
  client: PoolClient,
  staging: Staging,
  work: { channel: ChannelRecord; choices: Pick<ImportChoices, 'sameInstant' | 'among'>; closeS: number },
): Promise<StoredSum> {
  const { channel, choices } = work;
  const key = keyOf(channel);
  const { held, equal, different } = await compareStaged(client, staging, key);
  if (held === 0) return { stored: await staging.storeFresh(key), known: 0, other: 0, leftOut: 0 };
  if (different > 0) await settleDifferent(client, staging, work);
  let leftOut = 0;
  if (held > equal + different && choices.among !== 'both') {
    const { rows, stretches } = await rowsAmongSamples(client, staging, { ...key, closeS: work.closeS });
    const [first] = stretches;
    if (first !== undefined && choices.among === 'refuse') throw new RowsAmongSamplesError(rows, first);
    if (first !== undefined) leftOut = await leaveOutAmong(staging, key);
  }
  return { stored: await staging.storeUnknown(key), known: equal + different, other: different, leftOut };
}

async function settleDifferent(
  client: PoolClient,
  staging: Staging,
  { channel, choices }: { channel: ChannelRecord; choices: Pick<ImportChoices, 'sameInstant'> },
): Promise<void> {
  const key = keyOf(channel);
  if (choices.sameInstant === 'keep') return;
  if (choices.sameInstant === 'refuse') {
    const [first] = await differingRows(client, staging, key);
    throw new ConflictingSamplesError(first?.utcMs ?? 0);
  }
  const frozen = await frozenDifference(client, staging, { ...key, rigId: channel.rigId, runId: channel.runId });
  if (frozen !== null) throw new FrozenSamplesError(frozen);
  await replaceDiffering(client, staging, key);
}
