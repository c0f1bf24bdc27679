import { useMemo } from 'react';
import { useLabQuery } from '@/components/api';
import type { Series } from '@/components/charts';
import { readSamples } from '@/shared/contracts/data';
import { predictDeflection } from '@/shared/protocol/predict';
import type { TimelineItem } from '@/shared/protocol/timeline';
import { from, shiftedBy, toRad, zeroOffset } from './deflection-series';
import { nightPlan, plannedItems } from './live-plan';
import type { LiveState } from './live-reducer';

export interface RunStrip {
  steps: ReturnType<typeof nightPlan>['steps'];
  measured: Series | null;
  predicted: Series | null;
  equilibrium: Series | null;
  /** Newest measured deflection, rad. */
  newestRad: number | null;
}

const points = 2400;

/** Everything the strip of a run draws: log, rest of the plan, deflection from the database and from the stream, prediction. */
export function useRunStrip(runId: string, state: LiveState, timeZone: string): RunStrip {
  const { view, rows } = state;
  const history = useLabQuery(readSamples, { params: { runId }, query: { points: 2000 }, everyMs: 60_000 });
  const samples = history.data?.data ?? null;

  const rig = view?.rig ?? null;
  const protocol = view?.protocol ?? null;
  const startedAt = view?.startedAt ?? null;
  const shuffleSeed = view?.shuffleSeed;
  const runState = view?.state ?? null;
  const items = useMemo(
    () => (rig === null || protocol === null ? null : plannedItems({ rig, protocol, startedAt, shuffleSeed }, timeZone)),
    [rig, protocol, startedAt, shuffleSeed, timeZone],
  );
  const night = useMemo(() => (runState === null ? { steps: [], items: [] } : nightPlan(runState, rows, items)), [runState, rows, items]);

  const measured = useMemo(() => {
    if (rig === null) return null;
    const old = samples?.channel ? { x: samples.utcMs, y: toRad(samples.value, samples.channel.unit, rig) } : null;
    const lastOld = old?.x.at(-1) ?? -Infinity;
    const first = state.utcMs.findIndex((at) => at > lastOld);
    const fresh = state.channel === null || first < 0 ? null : toRad(state.value.slice(first), state.channel.unit, rig);
    if (!old?.y && !fresh) return null;
    return { x: [...(old?.y ? old.x : []), ...(fresh ? state.utcMs.slice(first) : [])], y: [...(old?.y ?? []), ...(fresh ?? [])] };
  }, [rig, samples, state.channel, state.utcMs, state.value]);

  const prediction = useMemo(() => {
    const first = night.items[0];
    const last = night.items.at(-1);
    if (rig === null || !first || !last) return null;
    try {
      return predictDeflection(
        rig,
        { items: night.items as TimelineItem[], startUtcMs: first.startUtcMs, endUtcMs: last.endUtcMs },
        points,
      );
    } catch {
      return null;
    }
  }, [rig, night]);

  return useMemo(() => {
    const newest = measured?.y.at(-1) ?? null;
    if (prediction === null) return { steps: night.steps, measured, predicted: null, equilibrium: null, newestRad: newest };
    const predicted = { x: prediction.utcMs, y: prediction.rad };
    const offset = measured === null ? 0 : zeroOffset(measured, predicted);
    const shown = shiftedBy(predicted, offset);
    return {
      steps: night.steps,
      measured,
      predicted: measured === null ? shown : from(shown, measured.x.at(-1) ?? -Infinity),
      equilibrium: shiftedBy({ x: prediction.utcMs, y: prediction.equilibriumRad }, offset),
      newestRad: newest,
    };
  }, [night, measured, prediction]);
}
