import type { StartCheck } from '@/shared/contracts/rigs';
import { formatClockWithZone } from '@/shared/lib/format-time';
import type { RigStation } from '../interfaces/rig-stations';
import { flowOf, type FlowFacts } from '../store/device-tokens';
import { channelsOfRig } from '../store/imports';
import type { Services } from './services';
import type { StartPlan } from './start-checks';

/** Whether the deflection has been flowing without a gap for so long that a night may be trusted to it. */

type Outcome = Pick<StartCheck, 'state' | 'detail'>;

/** What is asked for before a start. */
const WANTED_MS = 600_000;
/** Samples come in batches: silence counts from here on. */
const SILENT_MS = 60_000;
/** So many intervals between samples, and never less than 5 s, are a gap. */
const gapLimitS = (rateHz: number | null) => Math.max(5, 5 / (rateHz ?? 1));

export interface Flow extends FlowFacts {
  name: string;
  rateHz: number | null;
  nowUtcMs: number;
  /** From here on it must have flowed: 10 min ago, or for the simulated rig since its pendulum swings. */
  fromUtcMs: number;
  timeZone: string;
}

/** The check in words; pure. */
export function judgeFlow(flow: Flow): Outcome {
  const { name, nowUtcMs, fromUtcMs, lastUtcMs, firstUtcMs, gapS, gapUtcMs, timeZone } = flow;
  const fail = (detail: string): Outcome => ({ state: 'fail', detail });
  if (lastUtcMs === null || firstUtcMs === null)
    return fail(`The channel ${name} has had no sample for ${minutes(WANTED_MS)}: see to the device that fills it.`);
  const limitS = gapLimitS(flow.rateHz);
  const silentMs = nowUtcMs - lastUtcMs;
  if (silentMs > Math.max(SILENT_MS, 1000 * limitS))
    return fail(`The channel ${name} has had no sample for ${Math.round(silentMs / 1000)} s.`);
  const clock = (utcMs: number) => formatClockWithZone(utcMs, { timeZone });
  if (gapS > limitS)
    return fail(
      `The channel ${name} had a gap of ${Math.round(gapS)} s from ${clock(gapUtcMs ?? fromUtcMs)} on. Wait until ${clock((gapUtcMs ?? fromUtcMs) + 1000 * gapS + WANTED_MS)}: ${minutes(WANTED_MS)} without a gap are asked for.`,
    );
  if (firstUtcMs - fromUtcMs > 1000 * limitS)
    return fail(
      `The channel ${name} has been filled since ${clock(firstUtcMs)} only. Wait until ${clock(firstUtcMs + WANTED_MS)}: ${minutes(WANTED_MS)} without a gap are asked for.`,
    );
  return { state: 'pass', detail: `The channel ${name} is being filled, without a gap for ${minutes(nowUtcMs - fromUtcMs)}.` };
}

const minutes = (ms: number) => (ms < 60_000 ? `${Math.max(0, Math.round(ms / 1000))} s` : `${Math.round(ms / 60_000)} min`);

interface Source {
  id: string;
  name: string;
  rateHz: number | null;
  /** Since when it may be expected to flow, UTC ms. */
  sinceUtcMs: number;
}

export async function dataCheck(services: Services, plan: StartPlan, station: RigStation | null): Promise<Outcome> {
  const source = await sourceOf(services, plan, station);
  if (source === null) return { state: 'note', detail: 'No deflection arrives by itself on this rig: bring the file in after the run.' };
  const nowUtcMs = services.clock.utcMs();
  const fromUtcMs = Math.max(source.sinceUtcMs, nowUtcMs - WANTED_MS);
  const facts = await flowOf(services.database, { labId: plan.rig.labId, channelId: source.id, fromUtcMs });
  return judgeFlow({ ...facts, ...source, nowUtcMs, fromUtcMs, timeZone: plan.timeZone });
}

/** The channel of the rig itself, or the one that a device fills and the protocol registers; null where nothing flows in. */
async function sourceOf(services: Services, { rig, protocol }: StartPlan, station: RigStation | null): Promise<Source | null> {
  if (station?.channel != null) return { ...station.channel, rateHz: null };
  const streams = (await channelsOfRig(services.database.db, rig.labId, rig.id)).filter(
    ({ runId, source, role }) => runId === null && source === 'stream' && role === 'deflection',
  );
  const wanted = streams.find(({ name }) => name === protocol.evaluation?.channel) ?? (streams.length === 1 ? streams[0] : undefined);
  return wanted === undefined ? null : { id: wanted.id, name: wanted.name, rateHz: wanted.rateHz, sinceUtcMs: -Infinity };
}
