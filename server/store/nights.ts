import type { MorningNight } from '@/shared/contracts/morning';
import type { EvaluationResult } from '@/shared/evaluation/result';
import type { Connection } from './database';
import { sumsOf, type SampleWindow } from './sample-summaries';

/** What the morning sheet of a run is compared with, and how whole its deflection is. */

/** So many runs before this one are looked through for evaluated nights and for a control. */
const runsSearched = 40;

type NightRow = Pick<EvaluationResult, 'period_s'> & {
  id: string;
  startedAt: string;
  control: boolean;
  reversal: { value: number; u: number | null };
  decayTime: EvaluationResult['decayTime_s'];
  kappa: EvaluationResult['kappa_N_m'];
};

/** Runs on the rig before an instant, with the same mass set or with none in place, as their newest evaluation sees them, the newest first; no rehearsals. */
export async function nightsBefore(
  connection: Connection,
  run: { labId: string; rigId: string; massSetId: string | null; startedAtUtcMs: number },
): Promise<MorningNight[]> {
  const { rows } = await connection.pool.query<NightRow>(
    `with earlier as (
       select lab_id, id, started_at, mass_set_id, start #>> '{rig,sources,shape}' = 'none' as control from runs
       where lab_id = $1 and rig_id = $2 and not rehearsal and started_at < $3 order by started_at desc limit ${String(runsSearched)})
     select earlier.id, to_char(started_at at time zone 'UTC', 'YYYY-MM-DD"T"HH24:MI:SS.MS"Z"') as "startedAt", control,
       newest.result -> 'reversal_rad' as reversal, newest.result -> 'period_s' as period_s,
       newest.result -> 'decayTime_s' as "decayTime", newest.result -> 'kappa_N_m' as kappa
     from earlier, lateral (
       select result from evaluations where lab_id = earlier.lab_id and run_id = earlier.id and state = 'done' and result is not null and recomputes is null
       order by created_at desc limit 1) as newest
     where json_typeof(newest.result -> 'reversal_rad') = 'object' and (control or mass_set_id is not distinct from $4) order by started_at desc`,
    [run.labId, run.rigId, new Date(run.startedAtUtcMs), run.massSetId],
  );
  return rows.map(({ id, startedAt, control, reversal, period_s, decayTime, kappa }) => ({
    ...{ runId: id, startedAt, control, period_s, decayTime_s: decayTime, kappa_N_m: kappa },
    reversal_rad: { value: reversal.value, u: reversal.u },
  }));
}

/** Least and greatest value of a channel within a window, and its mean within each of the spans; null without a sample. */
export async function rangeAndMeans(
  connection: Connection,
  window: SampleWindow,
  spans: readonly { seq: number; fromUtcMs: number; toUtcMs: number }[],
): Promise<{ least: number; greatest: number; means: Map<number, number> } | null> {
  const [range, ...ofSpans] = await sumsOf(connection, window, [window, ...spans]);
  if (range === undefined || range.least === null || range.greatest === null) return null;
  return {
    least: range.least,
    greatest: range.greatest,
    means: new Map(
      spans.flatMap(({ seq }, index) => {
        const mean = ofSpans[index]?.mean ?? null;
        return mean === null ? [] : [[seq, mean]];
      }),
    ),
  };
}
