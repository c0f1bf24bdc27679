import { formatClock } from '../lib/format-time';
import { isWithinHours } from './hours';
import { alarmKinds, type AlarmCode, type Ringing } from './catalog';
import type { CallSettings, OwnCall } from './settings';

/** Who is rung next, and when what can wait is told: pure decisions over what was done so far. */

export interface Callee {
  userId: string;
  name: string;
  near: boolean;
  doNotRing: OwnCall['doNotRing'];
}

/** Members of the lab in the order in which they are rung: who started the run, the lab's order, and the owners where it has none. */
export function calleesOf(
  settings: CallSettings,
  members: readonly (Omit<Callee, 'near'> & { role: string })[],
  starterId: string | null,
): Callee[] {
  const fallback = members.filter(({ role }) => role === 'owner').map(({ userId }) => ({ userId, near: false }));
  const order = settings.order.length > 0 ? settings.order : fallback;
  const first =
    settings.starterFirst && starterId !== null
      ? [{ userId: starterId, near: order.find((one) => one.userId === starterId)?.near ?? false }]
      : [];
  const all = [...first, ...order.filter(({ userId }) => userId !== first[0]?.userId)];
  return all.flatMap(({ userId, near }) => {
    const member = members.find((one) => one.userId === userId);
    return member === undefined ? [] : [{ userId, near, name: member.name, doNotRing: member.doNotRing }];
  });
}

/**
 * The next to be rung: those whose hours allow it in their order, then, for what always rings, the others too. Nobody is rung twice for one cause.
 * @param rung ids of those who were rung for this cause already
 */
export function nextCallee(
  callees: readonly Callee[],
  { ringing, utcMs, timeZone, rung }: { ringing: Ringing; utcMs: number; timeZone: string; rung: readonly string[] },
): Callee | null {
  if (ringing !== 'always' && ringing !== 'allowed') return null;
  const left = callees.filter(({ userId }) => !rung.includes(userId));
  const allowed = left.find(({ doNotRing }) => doNotRing === null || !isWithinHours(doNotRing, formatClock(utcMs, { timeZone })));
  return allowed ?? (ringing === 'always' ? (left[0] ?? null) : null);
}

/** By day everything is told at once. */
const dayEnds = '22:00';
const quarterMs = 15 * 60_000;

interface Mornings {
  /** hh:mm in the lab's zone. */
  morningAt: string;
  timeZone: string;
}

const isDay = (utcMs: number, { morningAt, timeZone }: Mornings): boolean => {
  const clock = formatClock(utcMs, { timeZone });
  return clock >= morningAt && clock < dayEnds;
};

/** When what can wait for the morning is told: now by day, else at the next morning of the lab. */
export const morningUtcMs = (utcMs: number, lab: Mornings): number => (isDay(utcMs, lab) ? utcMs : nextMorningUtcMs(utcMs, lab));

/** The next morning of the lab, by day the one of tomorrow; now where the lab set an hour of the night. */
export function nextMorningUtcMs(utcMs: number, lab: Mornings): number {
  // In quarters of an hour, so that a change of the clocks in the night needs no rule of its own.
  for (let at = Math.ceil(utcMs / quarterMs) * quarterMs; at <= utcMs + 26 * 3_600_000; at += quarterMs)
    if (isDay(at, lab) && !isDay(Math.max(utcMs, at - quarterMs), lab)) return at;
  return utcMs;
}

/** So often those whom nothing reached are tried again: where nobody was reached, for the rest of the night (estimates, no source). */
const triesAgain = { withSomebody: 6, withNobody: 20, longestMin: 30 };

/**
 * After how long those whom nothing reached are tried again, ms: after 1, 2, 4 … 30 min; null: no more.
 * @param rounds how often they were tried again already
 * @param anybody somebody else was reached
 */
export function triedAgainMs(rounds: number, anybody: boolean): number | null {
  if (rounds >= (anybody ? triesAgain.withSomebody : triesAgain.withNobody)) return null;
  return Math.min(triesAgain.longestMin, 2 ** rounds) * 60_000;
}

/** Later than this nobody has to wait for the end of a run: a quarter of an hour after the predicted finish, up to the next ten minutes. */
export function worryUtcMs(predictedEndUtcMs: number): number {
  const tenMin = 600_000;
  return Math.ceil((predictedEndUtcMs + quarterMs) / tenMin) * tenMin;
}

/** Hours of the evening in which whoever started the run may still come back to the rig (common practice, no source). */
const evening = { from: '12:00', until: '23:30' };

/** What to do, for whoever is told at this time of day, hh:mm in the lab's zone. */
export function answerAt(code: AlarmCode, clock: string): string {
  const early = code === 'proof-failed' && clock >= evening.from && clock < evening.until;
  return early ? `It is early enough to come back. ${alarmKinds[code].answer}` : alarmKinds[code].answer;
}
