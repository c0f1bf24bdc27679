/**
 * The life of one alarm: one condition at one place. Terms after ISA-18.2 / IEC 62682 as public texts give them; no conformity is claimed.
 * A pure machine: events in, a new snapshot and what has to be told out. Times are UTC ms.
 */

export const alarmStates = [
  'normal',
  'active-unacknowledged',
  'active-acknowledged',
  'returned-unacknowledged',
  'latched',
  'shelved',
  'suppressed',
  'out-of-service',
] as const;
export type AlarmState = (typeof alarmStates)[number];

/** What the machine has to know of a kind of alarm. */
export interface AlarmRule {
  /** The condition must stand this long before the alarm is raised, s. */
  onDelayS: number;
  /** The condition must be away this long before the alarm has returned, s. */
  offDelayS: number;
  /** Stays until somebody resets it, also when the condition is away. */
  latches: boolean;
  /** Happens in a moment: there is no condition that could go away, so it stands until it is acknowledged. */
  momentary: boolean;
  /** Nobody may shelve it for longer, min. */
  shelveAtMostMin: number;
}

export interface Shelf {
  by: string;
  reason: string;
  untilUtcMs: number;
  /** Ends already when the condition goes away. */
  oneShot: boolean;
}

export interface AlarmSnapshot {
  /** Without what hides it: shelf, suppression, out of service. */
  state: Exclude<AlarmState, 'shelved' | 'suppressed' | 'out-of-service'>;
  /** The condition as it was last reported, without delays, and since when it is so. */
  met: boolean;
  metSinceUtcMs: number;
  /** The condition after the delays. */
  active: boolean;
  /** Counts how often it was raised: what was told belongs to one of these. */
  occurrence: number;
  raisedUtcMs: number | null;
  acknowledged: { by: string; utcMs: number } | null;
  /** Somebody has done what the alarm asks for. */
  confirmed: { by: string; utcMs: number; note: string } | null;
  shelf: Shelf | null;
  /** Why it cannot mean anything now; null while it can. */
  suppressedWhy: string | null;
  outOfService: { by: string; reason: string; utcMs: number } | null;
}

export const quietAlarm: AlarmSnapshot = {
  state: 'normal',
  met: false,
  metSinceUtcMs: 0,
  active: false,
  occurrence: 0,
  raisedUtcMs: null,
  acknowledged: null,
  confirmed: null,
  shelf: null,
  suppressedWhy: null,
  outOfService: null,
};

/** The state as people are shown it. */
export function shownState({ state, shelf, suppressedWhy, outOfService }: AlarmSnapshot): AlarmState {
  if (outOfService !== null) return 'out-of-service';
  if (suppressedWhy !== null) return 'suppressed';
  return shelf === null ? state : 'shelved';
}

export const isHidden = (alarm: AlarmSnapshot): boolean =>
  alarm.outOfService !== null || alarm.suppressedWhy !== null || alarm.shelf !== null;

/** Whether it stands on the screens: it wants an act of somebody, or still holds. */
export const isStanding = (alarm: AlarmSnapshot): boolean => !isHidden(alarm) && alarm.state !== 'normal';

type By = { by: string };
export type AlarmEvent = { utcMs: number } &
  /** `sinceUtcMs`: since when it is so, where that is known better than by now. */
  (
    | { type: 'condition'; met: boolean; sinceUtcMs?: number | undefined }
    /** Time has passed. */
    | { type: 'tick' }
    | ({ type: 'acknowledge' } & By)
    | ({ type: 'confirm'; note: string } & By)
    | ({ type: 'reset' } & By)
    | ({ type: 'shelve'; reason: string; untilUtcMs: number; oneShot: boolean } & By)
    | ({ type: 'unshelve' } & By)
    | { type: 'suppress'; why: string }
    | { type: 'unsuppress' }
    | ({ type: 'take-out'; reason: string } & By)
    | ({ type: 'return-to-service' } & By)
  );

/** What happened, for the history. `raised` is rung and told; `returned`, `acknowledged` and whatever hides it end the ringing. */
export type AlarmFact =
  | 'raised'
  | 'returned'
  | 'acknowledged'
  | 'confirmed'
  | 'latched'
  | 'reset'
  | 'shelved'
  | 'unshelved'
  | 'suppressed'
  | 'unsuppressed'
  | 'taken-out'
  | 'returned-to-service';

export type AlarmRefusal =
  | 'nothing-to-acknowledge'
  | 'not-acknowledged'
  | 'not-latched'
  | 'still-active'
  | 'shelved-too-long'
  | 'shelved-already'
  | 'not-shelved'
  | 'out-of-service-already'
  | 'in-service-already';

export type AlarmStep = { ok: true; alarm: AlarmSnapshot; facts: AlarmFact[] } | { ok: false; refusal: AlarmRefusal };

/** A working copy with what has happened to it so far. */
interface Working {
  alarm: AlarmSnapshot;
  facts: AlarmFact[];
  rule: AlarmRule;
  utcMs: number;
}

/** The next snapshot and what happened, or why a person's act is refused. */
export function advanceAlarm(alarm: AlarmSnapshot, event: AlarmEvent, rule: AlarmRule): AlarmStep {
  const working: Working = { alarm: { ...alarm }, facts: [], rule, utcMs: event.utcMs };
  // What is due by time comes first: a shelf that has ended hides nothing that comes now.
  passTime(working);
  const refusal = take(working, event);
  if (refusal !== null) return { ok: false, refusal };
  passTime(working);
  return { ok: true, alarm: working.alarm, facts: working.facts };
}

/** When something will happen by itself; null: nothing will. */
export function alarmDueUtcMs(alarm: AlarmSnapshot, rule: AlarmRule): number | null {
  const due: number[] = [];
  if (alarm.shelf !== null) due.push(alarm.shelf.untilUtcMs);
  if (alarm.met !== alarm.active) due.push(alarm.metSinceUtcMs + 1000 * (alarm.met ? rule.onDelayS : rule.offDelayS));
  return due.length === 0 ? null : Math.min(...due);
}

function passTime(working: Working): void {
  const { alarm, utcMs, rule } = working;
  if (alarm.shelf !== null && utcMs >= alarm.shelf.untilUtcMs) endShelf(working);
  if (alarm.met === alarm.active) return;
  if (utcMs < alarm.metSinceUtcMs + 1000 * (alarm.met ? rule.onDelayS : rule.offDelayS)) return;
  alarm.active = alarm.met;
  if (alarm.active) become(working);
  else goAway(working);
}

/** The condition holds and nothing hides it: the alarm is raised. */
function become(working: Working): void {
  const { alarm, utcMs } = working;
  if (isHidden(alarm) || alarm.state === 'active-unacknowledged' || alarm.state === 'active-acknowledged') return;
  // Back before anybody had seen it: the same occurrence, already told.
  const known = alarm.state === 'returned-unacknowledged';
  alarm.state = 'active-unacknowledged';
  if (known) return;
  alarm.occurrence += 1;
  Object.assign(alarm, { raisedUtcMs: utcMs, acknowledged: null, confirmed: null });
  working.facts.push('raised');
}

function goAway(working: Working): void {
  const { alarm, rule } = working;
  if (alarm.shelf?.oneShot === true) endShelf(working);
  if (alarm.state === 'active-unacknowledged') alarm.state = 'returned-unacknowledged';
  else if (alarm.state === 'active-acknowledged') alarm.state = rule.latches ? 'latched' : 'normal';
  else return;
  working.facts.push('returned');
  if (alarm.state === 'latched') working.facts.push('latched');
}

/** Whoever hides an alarm has seen it; what is latched stays so. */
function hide({ alarm }: Working): void {
  if (alarm.state !== 'latched') alarm.state = 'normal';
}

function endShelf(working: Working): void {
  working.alarm.shelf = null;
  working.facts.push('unshelved');
  showAgain(working);
}

/** Nothing hides it any more: a condition that holds is raised anew. */
function showAgain(working: Working): void {
  if (working.alarm.active) become(working);
}

function take(working: Working, event: AlarmEvent): AlarmRefusal | null {
  const { alarm, facts } = working;
  switch (event.type) {
    case 'condition':
      if (event.met !== alarm.met) Object.assign(alarm, { met: event.met, metSinceUtcMs: event.sinceUtcMs ?? event.utcMs });
      return null;
    case 'tick':
      return null;
    case 'suppress':
    case 'unsuppress':
      return suppressOrNot(working, event.type === 'suppress' ? event.why : null);
    case 'acknowledge':
      return acknowledge(working, event.by);
    case 'confirm':
      if (alarm.acknowledged === null) return 'not-acknowledged';
      alarm.confirmed = { by: event.by, utcMs: event.utcMs, note: event.note };
      facts.push('confirmed');
      return null;
    case 'reset':
      if (alarm.state !== 'latched') return 'not-latched';
      alarm.state = 'normal';
      facts.push('reset');
      return null;
    default:
      return shelfOrService(working, event);
  }
}

function suppressOrNot(working: Working, why: string | null): null {
  const { alarm, facts } = working;
  const before = alarm.suppressedWhy;
  alarm.suppressedWhy = why;
  if (why !== null && before === null) {
    hide(working);
    facts.push('suppressed');
  } else if (why === null && before !== null) {
    facts.push('unsuppressed');
    showAgain(working);
  }
  return null;
}

function acknowledge(working: Working, by: string): AlarmRefusal | null {
  const { alarm, facts, rule, utcMs } = working;
  if (isHidden(alarm) || (alarm.state !== 'active-unacknowledged' && alarm.state !== 'returned-unacknowledged'))
    return 'nothing-to-acknowledge';
  alarm.acknowledged = { by, utcMs };
  facts.push('acknowledged');
  if (rule.momentary) Object.assign(alarm, { met: false, metSinceUtcMs: utcMs, active: false });
  if (alarm.state === 'active-unacknowledged' && !rule.momentary) alarm.state = 'active-acknowledged';
  else alarm.state = rule.latches ? 'latched' : 'normal';
  if (alarm.state === 'latched') facts.push('latched');
  return null;
}

type ShelfOrService = Extract<AlarmEvent, { type: 'shelve' | 'unshelve' | 'take-out' | 'return-to-service' }>;

function shelfOrService(working: Working, event: ShelfOrService): AlarmRefusal | null {
  const { alarm, facts, rule } = working;
  switch (event.type) {
    case 'shelve': {
      if (alarm.shelf !== null) return 'shelved-already';
      const { by, reason, untilUtcMs, oneShot } = event;
      if (untilUtcMs <= event.utcMs || untilUtcMs > event.utcMs + rule.shelveAtMostMin * 60_000) return 'shelved-too-long';
      alarm.shelf = { by, reason, untilUtcMs, oneShot };
      hide(working);
      facts.push('shelved');
      return null;
    }
    case 'unshelve':
      if (alarm.shelf === null) return 'not-shelved';
      endShelf(working);
      return null;
    case 'take-out':
      if (alarm.outOfService !== null) return 'out-of-service-already';
      alarm.outOfService = { by: event.by, reason: event.reason, utcMs: event.utcMs };
      hide(working);
      facts.push('taken-out');
      return null;
    case 'return-to-service':
      if (alarm.outOfService === null) return 'in-service-already';
      alarm.outOfService = null;
      facts.push('returned-to-service');
      showAgain(working);
      return null;
  }
}
