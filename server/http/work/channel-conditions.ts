import { passesLimit } from '@/shared/alarms/limits';
import { againstRoom } from '@/shared/schedule/room';
import { channelNow, type LimitRecord } from '../../store/channel-limits';
import type { Database } from '../../store/database';
import type { RigRecord } from '../../store/rigs';
import { hoursOfRoom } from '../../store/schedules';
import type { RunFacts } from '../../engine/run-facts';
import type { Condition } from './rig-conditions';

/** Conditions that need a look into the database: limits of channels, the pendulum's excursion, the hours of the room. */

export const subjectOfLimit = (limitId: string) => `limit ${limitId}`;
const codes = { level: 'channel-level', slope: 'channel-slope', silence: 'channel-silent' } as const;

export async function limitConditions(
  db: Database,
  limits: readonly LimitRecord[],
  { utcMs, isMet }: { utcMs: number; isMet: (code: Condition['code'], subject: string) => boolean },
): Promise<Condition[]> {
  const found: Condition[] = [];
  for (const { id, limit, channelId, channelName, unit, labId } of limits) {
    const [code, subject] = [codes[limit.kind], subjectOfLimit(id)];
    const windowS = limit.kind === 'slope' ? limit.windowS : 600;
    const now = await channelNow(db, { labId, channelId }, { utcMs, windowMs: 1000 * windowS });
    if (!passesLimit(limit, { utcMs, ...now, met: isMet(code, subject) })) continue;
    const value = now.last === null ? '' : `${String(Number(now.last.value.toPrecision(4)))} ${unit}`;
    const words = {
      level: `${channelName} is at ${value}.`,
      slope: `${channelName} changes by ${String(Number((now.slopePerH ?? 0).toPrecision(3)))} ${unit} an hour.`,
      silence: `${channelName} has had no sample since ${new Date(now.last?.utcMs ?? 0).toISOString().slice(11, 19)} UTC.`,
    }[limit.kind];
    found.push({ code, subject, words, runId: null, rings: limit.rings, onDelayS: 'forS' in limit ? limit.forS : 0 });
  }
  return found;
}

/** Whether the run that began within the night window will pass its end. */
export async function lateCondition(
  db: Database,
  { runId, startedAtUtcMs, predictedEndUtcMs }: RunFacts,
  { timeZone, ...rig }: { labId: string; rigId: string; timeZone: string },
): Promise<Condition[]> {
  if (startedAtUtcMs === null || predictedEndUtcMs === null) return [];
  const hours = await hoursOfRoom(db, rig);
  const beginning = againstRoom(hours, { startUtcMs: startedAtUtcMs, endUtcMs: startedAtUtcMs + 1 }, timeZone);
  const whole = againstRoom(hours, { startUtcMs: startedAtUtcMs, endUtcMs: predictedEndUtcMs }, timeZone);
  return beginning === null && whole !== null ? [{ code: 'late-finish', subject: '', words: whole, runId }] : [];
}

const ofExcursion = 0.9;
const radOf: Readonly<Record<string, number>> = { rad: 1, mrad: 1e-3, urad: 1e-6 };

/** The pendulum beyond 90 % of its clearance or of the range of its readout, about its mean over the last four periods. */
export async function excursionCondition(
  db: Database,
  { document, labId }: RigRecord,
  { channel, utcMs, runId }: { channel: { id: string; unit: string }; utcMs: number; runId: string },
): Promise<Condition[]> {
  const period = document.measured?.period_s?.value;
  const ranges = [document.pendulum.travel_rad, document.readout?.range_rad].filter((range) => range !== undefined);
  const factor = radOf[channel.unit];
  if (period === undefined || ranges.length === 0 || factor === undefined) return [];
  const leastRange = Math.min(...ranges);
  const { extremes } = await channelNow(db, { labId, channelId: channel.id }, { utcMs, windowMs: 4000 * period, recentMs: 1000 * period });
  if (extremes === null) return [];
  const reach = factor * Math.max(extremes.greatest - extremes.mean, extremes.mean - extremes.least);
  if (reach < ofExcursion * leastRange) return [];
  const words = `The deflection reaches ${String(Math.round(reach * 1e6))} µrad of ${String(Math.round(leastRange * 1e6))} µrad.`;
  return [{ code: 'excursion', subject: '', words, runId, onDelayS: Math.round(period) }];
}
