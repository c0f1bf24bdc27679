import { readDecimal } from '@/components/ui/read-decimal';
import type { ExclusionView } from '@/shared/contracts/exclusions';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatClock } from '@/shared/lib/format-time';

/** Stretches of time that are excluded, and parts of steps as they are typed. Pure. */
export interface Stretch {
  startUtcMs: number;
  endUtcMs: number;
}

/** Clock times of a stretch and how long it is. */
export function stretchWords(stretch: Stretch, timeZone: string): string {
  const clock = (utcMs: number) => formatClock(utcMs, { timeZone, precision: 'seconds' });
  return `${clock(stretch.startUtcMs)} to ${clock(stretch.endUtcMs)}, ${formatDuration(lengthS(stretch))}`;
}

export const lengthS = ({ startUtcMs, endUtcMs }: Stretch): number => (endUtcMs - startUtcMs) / 1000;

/** The whole of a step, in s after its beginning as typed: its length is rounded up, so that the last moment belongs to it. */
export const wholeOf = (step: Stretch) => ({ from: '0', to: String(Math.ceil(lengthS(step))) });

export type TypedPart = { stretch: Stretch; errors: null } | { stretch: null; errors: { from?: string; to?: string } };

/** The part of a step from `from` to `to`, s after its beginning. */
export function partOf(step: Stretch, typed: { from: string; to: string }): TypedPart {
  const most = Math.ceil(lengthS(step));
  const [from, to] = [readDecimal(typed.from), readDecimal(typed.to)];
  const range = `a number of seconds from 0 to ${String(most)}`;
  if (from === null || from < 0 || from > most) return { stretch: null, errors: { from: range } };
  if (to === null || to < 0 || to > most) return { stretch: null, errors: { to: range } };
  if (to <= from) return { stretch: null, errors: { to: `more than ${typed.from.trim()} s, where the stretch begins` } };
  const endUtcMs = Math.min(step.endUtcMs, step.startUtcMs + 1000 * to);
  return { stretch: { startUtcMs: step.startUtcMs + 1000 * from, endUtcMs }, errors: null };
}

/** Exclusions that take something of a stretch, withdrawn ones too. */
export const touching = (exclusions: readonly ExclusionView[], stretch: Stretch): ExclusionView[] =>
  exclusions.filter((one) => one.startUtcMs < stretch.endUtcMs && one.endUtcMs > stretch.startUtcMs);

/** So many exclusions are told one by one where a plot is put into words. */
const mostTold = 5;

/** Those in force in words, for those who do not see the hatching; empty without any. */
export function excludedWords(exclusions: readonly ExclusionView[], timeZone: string): string {
  const inForce = exclusions.filter(({ withdrawn }) => withdrawn === null);
  if (inForce.length === 0) return '';
  const told = inForce.slice(0, mostTold).map((one) => `${stretchWords(one, timeZone)} (${one.made.reason})`);
  const rest = inForce.length > mostTold ? `; ${String(inForce.length - mostTold)} more` : '';
  return `${String(inForce.length)} excluded, hatched: ${told.join('; ')}${rest}`;
}

/** How much of a stretch is excluded at present; null where nothing is. */
export function excludedPart(exclusions: readonly ExclusionView[], stretch: Stretch): 'excluded' | 'partly excluded' | null {
  const inForce = touching(exclusions, stretch).filter(({ withdrawn }) => withdrawn === null);
  if (inForce.length === 0) return null;
  let reached = stretch.startUtcMs;
  for (const one of [...inForce].sort((a, b) => a.startUtcMs - b.startUtcMs)) {
    if (one.startUtcMs > reached) break;
    reached = Math.max(reached, one.endUtcMs);
  }
  return reached >= stretch.endUtcMs ? 'excluded' : 'partly excluded';
}
