import { passesLimit, type ChannelLimit, type ChannelNow } from '@/shared/alarms/limits';
import { NEAR_LIMIT, swingRoomRad } from '@/shared/conditions/dwell-verdict';
import { UnusableArchive } from '@/shared/archive/unusable-archive';
import { scaleOf, toRad, type ChannelScale } from '@/shared/evaluation/channel-scale';
import { formatDuration } from '@/shared/lib/format-duration';
import type { RigDocument } from '@/shared/rig/document';
import type { LimitRecord } from '../../store/channel-limits';
import { extremesAbout, slopePerHOf, spanOf } from '../../store/channel-now';
import type { Connection } from '../../store/database';
import type { RigRecord } from '../../store/rigs';
import { lastSampleOf } from '../../store/sample-summaries';
import type { Condition } from './rig-conditions';

/** Conditions that need a look into the database: limits of channels, the pendulum's excursion. */

export const subjectOfLimit = (limitId: string) => `limit ${limitId}`;
const codes = { level: 'channel-level', slope: 'channel-slope', span: 'channel-slope', silence: 'channel-silent' } as const;

const rounded = (value: number, digits = 3) => String(Number(value.toPrecision(digits)));

export interface LimitView {
  utcMs: number;
  isMet: (code: Condition['code'], subject: string) => boolean;
}

export async function limitConditions(
  connection: Connection,
  limits: readonly LimitRecord[],
  { utcMs, isMet }: LimitView,
): Promise<Condition[]> {
  const found: Condition[] = [];
  for (const { id, limit, channelId, channelName, unit, labId } of limits) {
    const [code, subject] = [codes[limit.kind], subjectOfLimit(id)];
    const now = await channelNow(connection, { labId, channelId }, { limit, utcMs });
    if (!passesLimit(limit, { ...now, met: isMet(code, subject) })) continue;
    const words = `${channelName} ${passedWords(limit, now, unit)}.`;
    found.push({ code, subject, words, runId: null, rings: limit.rings, onDelayS: 'forS' in limit ? limit.forS : 0 });
  }
  return found;
}

type Seen = Omit<ChannelNow, 'met'>;

/** What the limit asks to be known of the channel. */
async function channelNow(
  connection: Connection,
  channel: { labId: string; channelId: string },
  { limit, utcMs }: { limit: ChannelLimit; utcMs: number },
): Promise<Seen> {
  const window = (windowS: number) => ({ utcMs, windowMs: 1000 * windowS });
  return {
    utcMs,
    last: await lastSampleOf(connection, channel),
    slopePerH: limit.kind === 'slope' ? await slopePerHOf(connection, channel, window(limit.windowS)) : null,
    span: limit.kind === 'span' ? await spanOf(connection, channel, window(limit.windowS)) : null,
  };
}

function passedWords(limit: ChannelLimit, { last, slopePerH, span }: Seen, unit: string): string {
  switch (limit.kind) {
    case 'level':
      return `is at ${rounded(last?.value ?? NaN, 4)} ${unit}`;
    case 'slope':
      return `changes by ${rounded(slopePerH ?? NaN)} ${unit} an hour`;
    case 'span':
      return `spans ${rounded(span ?? NaN)} ${unit} in ${formatDuration(limit.windowS)}`;
    case 'silence':
      return `has had no sample since ${new Date(last?.utcMs ?? 0).toISOString().slice(11, 19)} UTC`;
  }
}

/** The pendulum beyond 90 % of its clearance or of the range of its readout, about its mean over the last four periods. */
export async function excursionCondition(
  connection: Connection,
  { document, labId }: RigRecord,
  { channel, utcMs, runId }: { channel: Deflection & { id: string }; utcMs: number; runId: string },
): Promise<Condition[]> {
  const period = document.measured?.period_s?.value;
  if (period === undefined || swingRoomRad(document) === null) return [];
  const spans = { utcMs, windowMs: 4000 * period, recentMs: 1000 * period };
  const extremes = await extremesAbout(connection, { labId, channelId: channel.id }, spans);
  const words = extremes === null ? null : excursionWords(document, channel, extremes);
  return words === null ? [] : [{ code: 'excursion', subject: '', words, runId, onDelayS: Math.round(period) }];
}

interface Deflection {
  name: string;
  unit: string;
}

/** Whether readings that lie so far apart are too near to the ends, in words; null where they are not, or where the rig document does not tell. */
export function excursionWords(
  document: RigDocument,
  channel: Deflection,
  { mean, least, greatest }: { mean: number; least: number; greatest: number },
): string | null {
  const roomRad = swingRoomRad(document);
  const scale = scaleIfTold(channel, document);
  if (roomRad === null || scale === null) return null;
  const [middleRad, ...endsRad] = [mean, least, greatest].map((reading) => toRad(scale, reading)) as [number, number, number];
  // A spot on a scale may count either way.
  const reachRad = Math.max(...endsRad.map((rad) => Math.abs(rad - middleRad)));
  if (reachRad < NEAR_LIMIT * roomRad) return null;
  return `The deflection reaches ${String(Math.round(reachRad * 1e6))} µrad of ${String(Math.round(roomRad * 1e6))} µrad.`;
}

/** Null where the rig document has no lever for a scale in metres. */
function scaleIfTold({ name, unit }: Deflection, document: RigDocument): ChannelScale | null {
  try {
    return scaleOf({ name, unit, quantity: '', role: 'deflection' }, document);
  } catch (error) {
    if (error instanceof UnusableArchive) return null;
    throw error;
  }
}
