import { formatDuration } from '@/shared/lib/format-duration';
import type { RigStation } from '../interfaces/rig-stations';
import { channelsOfRig } from '../store/imports';
import { sampleFlow, type SampleFlow } from '../store/runs-read';
import type { Services } from './services';
import { fail, note, pass, type Outcome, type StartPlan } from './start-check-parts';
import { judgeWaitedChannels, waitedFor } from './waited-channels';

/** Whether the deflection flows, and has for so long without a gap that a night may be trusted to it. */

/** Deflection older than this means that nothing is arriving. */
const freshMs = 60_000;
/** As long as the deflection has to have flowed before its flow is called steady, and the gap that it then may have had (no source). */
const flowMs = 600_000;
const longestGapMs = 10_000;
/** Of a slow channel so many intervals are a gap. */
const gapIntervals = 5;

export interface FlowSeen {
  name: string;
  rateHz: number | null;
  /** A device fills it: what stops once stops again, so a start waits. The simulated rig's own stops with the server alone. */
  device: boolean;
  nowUtcMs: number;
  flow: SampleFlow;
}

/** The check in words; pure. */
export function judgeFlow({ name, rateHz, device, nowUtcMs, flow }: FlowSeen): Outcome {
  if (flow.lastUtcMs === null) return fail(`The channel ${name} has no sample yet.`);
  const silentMs = Math.max(0, nowUtcMs - flow.lastUtcMs);
  const gapMs = flow.longestGapMs ?? 0;
  const mostGapMs = Math.max(longestGapMs, rateHz === null ? 0 : (1000 * gapIntervals) / rateHz);
  const figures = [
    { name: 'last sample', value: silentMs / 1000, unit: 's' as const },
    { name: 'longest gap', value: gapMs / 1000, unit: 's' as const },
  ];
  if (silentMs > Math.max(freshMs, mostGapMs))
    return fail(`The channel ${name} has had no sample for ${String(Math.round(silentMs / 1000))} s.`, ...figures);
  const unsteady = device ? fail : note;
  const wanted = device ? ' A start waits for 10 min without a gap.' : '';
  if (gapMs > mostGapMs) return unsteady(`The channel ${name} is being filled, but had a gap in the last 10 min.${wanted}`, ...figures);
  const flowsMs = nowUtcMs - (flow.firstUtcMs ?? nowUtcMs);
  if (flowsMs < flowMs - mostGapMs)
    return unsteady(
      `The channel ${name} is being filled, for ${formatDuration(flowsMs / 1000)} now; 10 min without a gap show that it is steady.${wanted}`,
      ...figures,
    );
  return pass(`The channel ${name} has been filled for 10 min without a gap.`, ...figures);
}

/** A rig that fills its channel itself, or whose device does, must be doing so; where data are brought in later nothing can be seen now. */
export async function dataCheck(services: Services, plan: StartPlan, station: RigStation | null): Promise<Outcome> {
  const source = await sourceOf(services, plan, station);
  if (source === null) return note('No deflection arrives by itself on this rig: bring the file in after the run.');
  const nowUtcMs = services.clock.utcMs();
  const flow = await sampleFlow(services.database, { labId: plan.rig.labId, channelId: source.id }, nowUtcMs - flowMs);
  return judgeFlow({ ...source, nowUtcMs, flow });
}

/** The channels that steps wait for; null where none does. */
export async function waitedChannelsCheck(services: Services, plan: StartPlan, station: RigStation | null): Promise<Outcome | null> {
  const wanted = waitedFor(plan.protocol);
  if (wanted.length === 0) return null;
  const [own, nowUtcMs] = [station?.channel ?? null, services.clock.utcMs()];
  const { labId, id: rigId } = plan.rig;
  const filled = (await channelsOfRig(services.database.db, labId, rigId)).filter(
    ({ id, runId, source }) => runId === null && (source === 'stream' || id === own?.id),
  );
  const channels = await Promise.all(
    filled.map(async ({ id, name, unit, role, rateHz }) => {
      const { lastUtcMs } = await sampleFlow(services.database, { labId, channelId: id }, nowUtcMs - freshMs);
      return { name, unit, role, rateHz, lastUtcMs };
    }),
  );
  const deflection = (await sourceOf(services, plan, station))?.name ?? null;
  return judgeWaitedChannels({ wanted, channels, deflection, document: plan.document, nowUtcMs });
}

type Source = Pick<FlowSeen, 'name' | 'rateHz' | 'device'> & { id: string };

/** The channel of the rig itself, or the one that a device fills and the protocol registers; null where nothing flows in. */
async function sourceOf(services: Services, { rig, protocol }: StartPlan, station: RigStation | null): Promise<Source | null> {
  if (station?.channel != null) return { id: station.channel.id, name: station.channel.name, rateHz: null, device: false };
  const streams = (await channelsOfRig(services.database.db, rig.labId, rig.id)).filter(
    ({ runId, source, role }) => runId === null && source === 'stream' && role === 'deflection',
  );
  const wanted = streams.find(({ name }) => name === protocol.evaluation?.channel) ?? (streams.length === 1 ? streams[0] : undefined);
  return wanted === undefined ? null : { id: wanted.id, name: wanted.name, rateHz: wanted.rateHz, device: true };
}
