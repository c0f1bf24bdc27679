import { readDecimal } from '@/components/ui/read-decimal';
import { inputWords } from '@/shared/evaluation/input-words';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatPercent } from '@/shared/lib/format-number';
import type { NightForecast } from '@/shared/planning/night-forecast';
import type { StrategyNight } from '@/shared/planning/strategies';

/** What a planned night would give, in words. Pure. */

export const pairsOf = (dwells: number): string => {
  const pairs = Math.floor(dwells / 2);
  return `${pairs} ${pairs === 1 ? 'pair' : 'pairs'}`;
};

const strategyNames: Record<StrategyNight['strategy'], string> = {
  plain: 'Plain swings, fitted through the ringing',
  shaped: 'Shaped swings',
  wait: 'Plain swings, waiting until the ringing has died to 1 %',
};

export interface StrategyLine {
  name: string;
  under: string;
  u: string;
  best: boolean;
}

/** Each way of spending the hours of the plan, with its best beat and what it would leave open. */
export function strategyLines({ strategies }: NightForecast): StrategyLine[] {
  const least = Math.min(...strategies.map(({ predicted }) => predicted.statistics));
  return strategies.map(({ strategy, cadence: { dwells, cycleS, dwellS }, predicted: { relativeU, statistics } }) => ({
    name: strategyNames[strategy],
    under: `best beat ${formatDuration(cycleS)}, dwell ${formatDuration(dwellS)}, ${pairsOf(dwells)}; dwells alone ${formatPercent(statistics)}`,
    u: formatPercent(relativeU, 3),
    best: statistics === least,
  }));
}

export interface SourceLine {
  name: string;
  u: string;
  share: number;
}

/** The sources of u(G), the greatest first, so many of them. */
export function sourceLines({ predicted: { bySource, relativeU } }: NightForecast, count: number): SourceLine[] {
  return Object.entries(bySource)
    .sort(([, a], [, b]) => b - a)
    .slice(0, count)
    .map(([source, u]) => ({ name: inputWords(source), u: formatPercent(u), share: relativeU === 0 ? 0 : (u / relativeU) ** 2 }));
}

/** What the dwells make of it, what the wandering of the zero costs, and how many pairs are enough. */
export function dwellWords({ predicted: { statistics }, wandering, enoughPairs }: NightForecast): string {
  const drift = wandering > 0 ? `, of it ${formatPercent(wandering)} for the wandering of the zero` : '';
  const enough =
    enoughPairs === null
      ? 'Every further pair makes u(G) smaller.'
      : `From ${enoughPairs} ${enoughPairs === 1 ? 'pair' : 'pairs'} on, more of them lower u(G) by less than 5 %.`;
  return `The dwells leave ${formatPercent(statistics)} of G open${drift}. ${enough}`;
}

/** A wanted u(G) as written in per cent of G: its share, or what is wrong with it; null for nothing written. */
export function readWantedU(text: string): { share: number } | { wrong: string } | null {
  const written = text.trim();
  if (written === '') return null;
  const percent = readDecimal(written.replace(/\s*%$/, ''));
  const right = 'Give it in per cent of G, for example 0.4.';
  if (percent === null) return { wrong: `This is no number. ${right}` };
  if (!(percent > 0)) return { wrong: `u is above 0. ${right}` };
  if (percent >= 100) return { wrong: `100 % or more says nothing about G. ${right}` };
  return { share: percent / 100 };
}
