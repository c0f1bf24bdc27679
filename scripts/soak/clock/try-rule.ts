import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { occurrencesBetween } from '@/shared/schedule/occurrences';
import { weekdays } from '@/shared/schedule/plan';
import { temporalStarts, zones } from './temporal-starts';

/** All starts of a rule in a zone and a year, from a seed: what differs from an independent calendar. Zones take turns, half of the times lie where clocks are changed. */
export function tryRule(seed: number): string[] {
  const random = xoroshiro128plus(seed * 32_452_843 + 5);
  const between = (least: number, greatest: number) => uniformInt(random, least, greatest);
  const twoDigits = (number: number) => String(number).padStart(2, '0');
  const zone = zones[seed % zones.length] as string;
  const year = between(2020, 2045);
  const time = `${twoDigits(between(0, 1) === 0 ? between(0, 3) : between(0, 23))}:${twoDigits(between(0, 59))}`;
  const chosen = between(1, 2 ** weekdays.length - 1);
  const days = weekdays.filter((_, index) => (chosen >> index) % 2 === 1);
  const dayIn = (least: number, greatest: number) => `${year}-${twoDigits(between(least, greatest))}-${twoDigits(between(1, 28))}`;
  const until = between(0, 3) === 0 ? dayIn(7, 12) : null;
  const plan = { kind: 'weekly' as const, days, time, from: between(0, 3) === 0 ? dayIn(1, 6) : `${year - 1}-01-01`, until };
  const [fromMs, untilMs] = [Date.UTC(year, 0, 1), Date.UTC(year + 1, 0, 1)];
  const found = occurrencesBetween(plan, zone, { afterUtcMs: fromMs, untilUtcMs: untilMs }).map(({ dueUtcMs }) => dueUtcMs);
  const wanted = temporalStarts(plan, zone, { fromMs, untilMs });
  const at = wanted.findIndex((ms, index) => ms !== found[index]);
  if (at < 0 && found.length === wanted.length) return [];
  const told = (ms: number | undefined) => (ms === undefined ? 'nothing' : new Date(ms).toISOString());
  const first = at < 0 ? wanted.length : at;
  return [
    `rule ${seed} (${zone}, ${JSON.stringify(plan)}): start ${first + 1} is ${told(found[first])}, and should be ${told(wanted[first])}`,
  ];
}
