import type { ChainedEvent, StepRow } from '../archive/run-records';
import type { MorningMoment, MorningNight, MorningSheet } from '../contracts/morning';
import type { EvaluationResult } from '../evaluation/result';
import { predictSignal } from '../protocol/predict';
import type { Timeline } from '../protocol/timeline';
import type { RigDocument } from '../rig/document';
import { slipToleranceDeg } from '../rig/position-proof';
import { type Loss, lossesOf, lostByCause } from './losses';
import { nextNight, sharesOfBudget } from './next-night';
import { driftOf, roomOf, type RoomChannel } from './room';
import { morningTicks, type RecordFacts, type SampleCover } from './ticks';

/** All that the sheet is read off. Times in UTC ms. */
export interface MorningFacts {
  runId: string;
  rig: RigDocument;
  startedAtUtcMs: number;
  /** End of the run, or now while it is held. */
  endUtcMs: number;
  /** The protocol as planned from the start of the run. */
  plan: Pick<Timeline, 'endUtcMs' | 'dwells' | 'truncated'>;
  rows: readonly StepRow[];
  events: readonly ChainedEvent[];
  record: RecordFacts;
  cover: SampleCover | null;
  /** Channels of the surroundings that have samples within the run. */
  room: readonly RoomChannel[];
  /** Of the newest evaluation that came to one. */
  result: EvaluationResult | null;
  /** Why the newest evaluation came to no result; null where it did, or where there was none. */
  failure: string | null;
  earlier: readonly MorningNight[];
}

const worstAtMost = 3;

/** The morning sheet of one run: pure. */
export function morningSheet(facts: MorningFacts): MorningSheet {
  const { rig, rows, events, result, plan } = facts;
  const losses = lossesOf(rows, events, facts.endUtcMs);
  const ended = rows.filter((row) => row.kind === 'dwell' && row.endUtcMs !== null);
  const done = ended.filter((row) => row.outcome === 'done');
  const dwells = { planned: plan.dwells, done: done.length, good: done.filter(({ good }) => good !== false).length };
  const control = rig.sources.shape === 'none';
  const predictedRad = control ? null : (predictSignal(rig)?.signalRad ?? null);
  const ticks = morningTicks({ ...facts, edgeToleranceDeg: slipToleranceDeg(rig), predictedRad, control });
  return {
    plannedEndAt: plan.truncated ? null : new Date(plan.endUtcMs).toISOString(),
    dwells,
    lost: lostByCause(losses),
    ticks,
    tonight: nightOf(facts),
    G: result?.G == null ? null : { value: result.G.value, u: result.G.u },
    earlier: [...facts.earlier],
    drift: driftOf(result, rows),
    room: roomOf(facts.room, rows),
    shares: sharesOfBudget(result?.budget ?? null),
    worst: worstOf(losses),
    next: nextNight({ ...facts, ticks, dwells }),
  };
}

/** A night as its evaluation sees it; null where it found no near minus far. */
export function nightOf({
  runId,
  rig,
  startedAtUtcMs,
  result,
}: Pick<MorningFacts, 'runId' | 'rig' | 'startedAtUtcMs' | 'result'>): MorningNight | null {
  if (result?.reversal_rad == null) return null;
  const { value, u } = result.reversal_rad;
  return {
    runId,
    startedAt: new Date(startedAtUtcMs).toISOString(),
    control: rig.sources.shape === 'none',
    reversal_rad: { value, u },
    period_s: result.period_s,
    decayTime_s: result.decayTime_s,
    kappa_N_m: result.kappa_N_m,
  };
}

/** Stretches that begin in the same row are one moment; the costliest first. */
function worstOf(losses: readonly Loss[]): MorningMoment[] {
  const moments = new Map<number, MorningMoment>();
  for (const { seq, fromUtcMs, s, reason, words } of losses) {
    const known = moments.get(seq);
    if (known === undefined) moments.set(seq, { seq, at: new Date(fromUtcMs).toISOString(), words: reason === '' ? words : reason, s });
    else known.s += s;
  }
  return [...moments.values()].sort((a, b) => b.s - a.s).slice(0, worstAtMost);
}
