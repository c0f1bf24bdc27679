import type { KeptChannel, tryRetention } from '@/shared/contracts/retention';
import type { ResponseOf } from '@/shared/contracts/route';
import { formatFixed } from '@/shared/lib/format-number';
import { formatDay } from '@/shared/lib/format-time';

/** How long samples are kept, in words. */

export const countWords = (count: number): string =>
  count === 1 ? 'one sample' : count === 0 ? 'no sample' : `${formatFixed(count, { decimals: 0 })} samples`;

export const keepWords = (days: number | null): string => (days === null ? 'for ever' : `${formatFixed(days, { decimals: 0 })} days`);

/** Whose rule a channel goes by, and from when on. */
export function ruleWords({ rule, keepDays, holdsFrom }: KeptChannel, { nowMs, timeZone }: { nowMs: number; timeZone: string }): string {
  const whose = rule === null || rule.asLab ? 'as the lab: ' : '';
  const fromMs = holdsFrom === null ? -Infinity : Date.parse(holdsFrom);
  const later = keepDays !== null && fromMs > nowMs ? `; nothing goes before ${formatDay(fromMs, timeZone)}` : '';
  return `${whose}${keepWords(keepDays)}${later}`;
}

/** What is left of a channel that was thinned; null where nothing was. */
export const thinnedWords = (thinned: KeptChannel['thinned'], timeZone: string): string | null =>
  thinned === null
    ? null
    : `Full rate from ${formatDay(Date.parse(thinned.toAt), timeZone)} on and within runs; before, summaries of 2\u00a0s. ${countWords(thinned.samples)} went.`;

/** What a rule would take away now. */
export function dryWords({ samples, fromAt, toAt, kept, channels }: ResponseOf<typeof tryRetention>, timeZone: string): string {
  const whose = channels === 1 ? '' : ` of ${String(channels)} channels`;
  const span =
    fromAt === null || toAt === null ? '' : `, from ${formatDay(Date.parse(fromAt), timeZone)} to ${formatDay(Date.parse(toAt), timeZone)}`;
  const go =
    samples === 0
      ? `Nothing${whose} is that old, or all of it lies within runs.`
      : `${capital(countWords(samples))}${whose} would go${span}.`;
  return kept === 0
    ? go
    : `${go} ${capital(countWords(kept))} of that age ${kept === 1 ? 'lies' : 'lie'} within runs or an hour about them and ${kept === 1 ? 'stays' : 'stay'}.`;
}

const capital = (words: string) => words.charAt(0).toUpperCase() + words.slice(1);
