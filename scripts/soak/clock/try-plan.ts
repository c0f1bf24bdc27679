import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { occurrencesBetween } from '@/shared/schedule/occurrences';
import { weekdays, type RoomHours, type SchedulePlan } from '@/shared/schedule/plan';
import { againstRoom } from '@/shared/schedule/room';
import { temporalRoom, temporalStarts, zones } from './temporal-starts';

/**
 * A plan of any kind (once, every day, some days of the week) in a zone and a year, with a night window and blackout dates, from a seed: which starts it has, and which of them may be
 * in the room, beside an independent calendar. Half of the times lie where clocks are changed.
 */
export function tryPlan(seed: number): string[] {
  const random = xoroshiro128plus(seed * 49_979_687 + 3);
  const between = (least: number, greatest: number) => uniformInt(random, least, greatest);
  const twoDigits = (number: number) => String(number).padStart(2, '0');
  const clock = () => `${twoDigits(between(0, 1) === 0 ? between(0, 3) : between(0, 23))}:${twoDigits(between(0, 59))}`;
  const zone = zones[seed % zones.length] as string;
  const year = between(2020, 2045);
  const dayIn = (month: number) => `${year}-${twoDigits(month)}-${twoDigits(between(1, 28))}`;
  const [fromMs, untilMs] = [Date.UTC(year, 0, 1), Date.UTC(year + 1, 0, 1)];
  const plan: SchedulePlan =
    between(0, 2) === 0
      ? { kind: 'once', date: dayIn(between(2, 11)), time: clock() }
      : {
          ...{ kind: 'weekly', time: clock(), from: dayIn(between(1, 3)), until: between(0, 1) === 0 ? dayIn(between(9, 12)) : null },
          days: between(0, 1) === 0 ? [...weekdays] : [weekdays[between(0, 6)] ?? 'mon'],
        };
  const hours: RoomHours = {
    nightWindow: between(0, 3) === 0 ? null : { from: clock(), until: clock() },
    blackouts: Array.from({ length: between(0, 4) }, () => {
      const month = between(1, 11);
      return { from: dayIn(month), until: dayIn(month + 1), why: 'the room is painted' };
    }),
  };
  const lastsMs = between(1, 1_000) * 60_000;
  const found = occurrencesBetween(plan, zone, { afterUtcMs: fromMs, untilUtcMs: untilMs }).map(({ dueUtcMs }) => dueUtcMs);
  const wanted = temporalStarts(plan, zone, { fromMs, untilMs });
  const stayOf = (startUtcMs: number) => ({ startUtcMs, endUtcMs: startUtcMs + lastsMs });
  const told = (ms: number, may: boolean) => `${new Date(ms).toISOString()} ${may ? 'may start' : 'may not start'}`;
  const is = found.map((ms) => told(ms, againstRoom(hours, stayOf(ms), zone) === null));
  const should = wanted.map((ms) => told(ms, temporalRoom(hours, stayOf(ms), zone)));
  const at = Array.from({ length: Math.max(is.length, should.length) }).findIndex((_, index) => is[index] !== should[index]);
  if (at < 0) return [];
  const what = JSON.stringify({ zone, plan, hours, lastsMs });
  return [`plan ${seed} (${what}): start ${at + 1} is ${is[at] ?? 'nothing'}, and should be ${should[at] ?? 'nothing'}`];
}
