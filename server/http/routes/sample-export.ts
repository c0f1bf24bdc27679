import { Readable } from 'node:stream';
import { pipeline } from 'node:stream/promises';
import * as contracts from '@/shared/contracts/data';
import { csvHead, csvLines, ndjsonLines } from '@/shared/archive/sample-lines';
import type { SampleBatch } from '@/server/interfaces/sample-store';
import { findChannel, type ChannelRecord } from '@/server/store/imports';
import { thinnedWithin, type Thinned } from '@/server/store/retention';
import { attach, fileWords } from '../attachment';
import { isoOf } from '../maker';
import { notFound, ProblemError } from '../problem-error';
import { mount, type RouteContext } from '../route-context';

type Export = RouteContext<typeof contracts.exportSamplesCsv> | RouteContext<typeof contracts.exportSamplesNdjson>;

/** How the samples of a channel are written. */
interface Format {
  ending: string;
  type: string;
  head: string;
  lines: (page: SampleBatch) => string;
}

/** @throws ProblemError for one that ends before it begins */
export function exportWindow({ fromUtcMs = -Infinity, toUtcMs = Infinity }: Export['query']): { fromUtcMs: number; toUtcMs: number } {
  if (toUtcMs < fromUtcMs)
    throw new ProblemError('invalid-input', 'The window ends before it begins.', [{ path: 'toUtcMs', message: 'not before fromUtcMs' }]);
  return { fromUtcMs, toUtcMs };
}

/** A header stays short. */
const mostTold = 20;
const toldOf = ({ fromUtcMs, toUtcMs, samples }: Thinned) => `${isoOf(fromUtcMs)}/${isoOf(toUtcMs)};samples=${String(samples)}`;

/** Streams a window of a channel; a header tells the stretches of which summaries alone are left. What has been sent cannot be taken back: a failure in its midst breaks the download off, which the browser tells. */
async function sendSamples(
  { params, membership, services, query, res }: Export,
  formatOf: (channel: ChannelRecord) => Format,
): Promise<undefined> {
  const { labId } = membership;
  const channel = await findChannel(services.database.db, labId, params.channelId);
  if (channel === null) throw notFound('channel');
  const { fromUtcMs, toUtcMs } = exportWindow(query);
  const { ending, type, head, lines } = formatOf(channel);
  const day = Number.isFinite(fromUtcMs) ? `-${isoOf(fromUtcMs).slice(0, 10)}` : '';
  attach(res, `evenfall-${fileWords(channel.name, 'channel')}${day}-${channel.id.slice(0, 8)}.${ending}`);
  res.type(type);
  const gone = await thinnedWithin(services.database.db, { labId, channelId: channel.id, fromUtcMs, toUtcMs });
  if (gone.length > 0) res.set('Evenfall-Thinned', gone.slice(0, mostTold).map(toldOf).join(', '));
  const text = async function* () {
    if (head !== '') yield head;
    for await (const page of services.samples.pages(labId, channel.id, { fromUtcMs, toUtcMs })) {
      yield lines(page);
      await services.breathe();
    }
  };
  try {
    await pipeline(Readable.from(text()), res);
  } catch (error) {
    if (!isGone(error)) throw error;
  }
  return undefined;
}

/** Whoever asked went away. */
export const isGone = (error: unknown): boolean => error instanceof Error && 'code' in error && error.code === 'ERR_STREAM_PREMATURE_CLOSE';

export const sampleExportRoutes = [
  mount(contracts.exportSamplesCsv, (context) =>
    sendSamples(context, ({ unit }) => ({ ending: 'csv', type: 'text/csv', head: csvHead(unit), lines: csvLines })),
  ),
  mount(contracts.exportSamplesNdjson, (context) =>
    sendSamples(context, ({ name }) => ({
      ...{ ending: 'ndjson', type: 'application/x-ndjson', head: '' },
      lines: (page) => ndjsonLines(page, name),
    })),
  ),
];
