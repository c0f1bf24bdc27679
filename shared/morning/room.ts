import type { StepRow } from '../archive/run-records';
import type { MorningSheet } from '../contracts/morning';
import type { EvaluationResult } from '../evaluation/result';
import { abaDifference, isAlternating } from '../statistics/drift';

/** How quiet the room was, and how the zero of the pendulum wandered. */

export interface RoomChannel {
  name: string;
  /** Unit of the channel. */
  unit: string;
  least: number;
  greatest: number;
  /** Mean within each dwell in which it has samples, by row of the step log. */
  means: ReadonlyMap<number, number>;
}

type DwellRow = Pick<StepRow, 'seq' | 'kind' | 'station' | 'startUtcMs' | 'endUtcMs'>;

const sideOf = (station: string): 1 | -1 | null => (station.startsWith('near') ? 1 : station.startsWith('far') ? -1 : null);
const middleS = ({ startUtcMs, endUtcMs }: DwellRow) => (startUtcMs + (endUtcMs ?? startUtcMs)) / 2000;

/** Range of each channel, and what of it goes in step with the swings: near minus far of its means by ABA windows, as for the pendulum. */
export function roomOf(channels: readonly RoomChannel[], rows: readonly DwellRow[]): MorningSheet['room'] {
  return channels.map(({ name, unit, least, greatest, means }) => {
    const series = rows.flatMap((row) => {
      const [side, value] = [sideOf(row.station), means.get(row.seq)];
      return row.kind !== 'dwell' || side === null || value === undefined ? [] : [{ timeS: middleS(row), side, value }];
    });
    const tells = series.length >= 3 && isAlternating(series);
    const { value, u } = tells ? abaDifference(series) : { value: 0, u: null };
    return { name, unit, least, greatest, inStep: tells ? { value, u } : null };
  });
}

const perHour = 3600;

/**
 * Wander of the zero at the beginning and at the end, rad/h: change of the fitted centre from one dwell to the next on the same side, mean of
 * both sides. Null with fewer than two dwells on a side.
 */
export function driftOf(result: EvaluationResult | null, rows: readonly DwellRow[]): MorningSheet['drift'] {
  const byRow = new Map(rows.map((row) => [row.seq, row]));
  const rates = ([1, -1] as const).map((side) => {
    const centres = (result?.dwells ?? []).flatMap(({ seq, theta_rad, used }) => {
      const row = byRow.get(seq);
      return row === undefined || !used || theta_rad === null || sideOf(row.station) !== side
        ? []
        : [{ timeS: middleS(row), ...theta_rad }];
    });
    return centres.slice(1).map((centre, index) => {
      const before = centres[index] as typeof centre;
      const perRad = perHour / (centre.timeS - before.timeS);
      return { value: (centre.value - before.value) * perRad, u: Math.hypot(centre.u, before.u) * perRad };
    });
  });
  const both = (pick: (of: { value: number; u: number }[]) => { value: number; u: number } | undefined) => {
    const [near, far] = rates.map(pick);
    return near === undefined || far === undefined ? null : { value: (near.value + far.value) / 2, u: Math.hypot(near.u, far.u) / 2 };
  };
  const [start, end] = [both((of) => of[0]), both((of) => of.at(-1))];
  return start === null || end === null ? null : { start, end };
}
