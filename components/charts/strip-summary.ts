import { formatClock, zoneName } from '@/shared/lib/format-time';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatDegrees } from '@/shared/lib/format-angle';
import { standsOf, type StripStep } from './strip-model';

/** The strip in words, for those who do not see it. Pure. */

export interface SummaryInput {
  steps: readonly StripStep[];
  timeZone: string;
  nowUtcMs?: number | null | undefined;
  hasMeasured: boolean;
}

const plural = (n: number, word: string) => `${n} ${word}${n === 1 ? '' : 's'}`;

/** One or two sentences: how many dwells on which side, from when to when, how many are over, what is going on. */
export function stripSummary({ steps, timeZone, nowUtcMs, hasMeasured }: SummaryInput): string {
  const first = steps[0];
  const last = steps.at(-1);
  if (!first || !last) return 'No steps yet.';
  // The ring-down after a kick is recorded too, but is no dwell of the series.
  const stands = standsOf(steps.filter(({ kind }) => kind !== 'ring-down')).filter((stand) => stand.measured);
  const count = (lane: string) => stands.filter((stand) => stand.lane === lane).length;
  const others = stands.length - count('near') - count('far');
  const sides = [
    `${plural(count('near'), 'near dwell')} and ${plural(count('far'), 'far dwell')}`,
    others > 0 ? `, ${others} elsewhere` : '',
  ].join('');
  const span = `from ${formatClock(first.startUtcMs, { timeZone })} to ${formatClock(last.endUtcMs, { timeZone })}, ${zoneName(timeZone)}, ${formatDuration((last.endUtcMs - first.startUtcMs) / 1000)}`;
  const over = stands.filter((stand) => stand.phase === 'past').length;
  const bad = stands.filter((stand) => stand.good === false).length;
  const progress =
    over > 0 || nowUtcMs != null ? ` ${over} of ${plural(stands.length, 'dwell')} done${bad > 0 ? `, ${bad} not good` : ''}.` : '';
  const running = steps.find((step) => step.phase === 'running');
  const present = running ? ` Now: ${stepWords(running)}.` : '';
  return `${sides}, ${span}.${progress}${present}${hasMeasured ? ' The solid line is the measured deflection.' : ''}`;
}

/** A step in a few words: `dwell at near`, `swing to far`, `home`. */
function stepWords(step: { kind: string; station: string; label?: string }): string {
  const place =
    step.station === ''
      ? ''
      : step.kind === 'swing'
        ? ` to ${step.station}`
        : step.kind === 'home' || step.kind === 'mark'
          ? ''
          : ` at ${step.station}`;
  const label = step.label ? ` (${step.label})` : '';
  return step.kind + place + label;
}

export interface SummaryRow {
  key: string;
  step: string;
  start: string;
  length: string;
  angle: string;
  state: string;
}

/** The same as a table; at most `limit` rows, those nearest to the present. */
export function stripRows(input: SummaryInput, limit = 120): { rows: SummaryRow[]; left: number } {
  const { steps, timeZone, nowUtcMs } = input;
  const current =
    nowUtcMs == null
      ? 0
      : Math.max(
          0,
          steps.findLastIndex((step) => step.startUtcMs <= nowUtcMs),
        );
  const start = Math.max(0, Math.min(current - Math.floor(limit / 2), steps.length - limit));
  const rows = steps.slice(start, start + limit).map((step) => ({
    key: step.key,
    step: stepWords(step),
    start: formatClock(step.startUtcMs, { timeZone, precision: 'seconds' }),
    length: formatDuration((step.endUtcMs - step.startUtcMs) / 1000),
    angle: formatDegrees(step.angleToDeg),
    state: [step.phase === 'past' ? (step.outcome ?? 'done') : step.phase, step.good === false ? 'not good' : '']
      .filter(Boolean)
      .join(', '),
  }));
  return { rows, left: steps.length - rows.length };
}
