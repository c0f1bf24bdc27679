import type { AlarmFact } from './machine';

/** One time that an alarm was raised, put together from its history. */
export interface Occurrence {
  alarmId: string;
  occurrence: number;
  raisedUtcMs: number;
  /** What was found. */
  words: string;
  /** When its condition went away, or the moment itself where there is no condition; null: it holds still, as far as is known. */
  untilUtcMs: number | null;
  seen: { by: string; utcMs: number } | null;
  done: { by: string; utcMs: number; note: string } | null;
  /** Put on a shelf, suppressed or taken out of service before it was over. */
  aside: { by: string; utcMs: number; why: string } | null;
}

export interface HistoryFact {
  alarmId: string;
  occurrence: number;
  at: number;
  fact: string;
  by: string;
  words: string;
}

const hiding: readonly AlarmFact[] = ['shelved', 'suppressed', 'taken-out'];

/** Every occurrence of which `facts` tell the raising, in the order of raising. `facts` stand in the order in which they happened. */
export function occurrencesOf(facts: readonly HistoryFact[], isMomentary: (alarmId: string) => boolean): Occurrence[] {
  const found = new Map<string, Occurrence>();
  for (const fact of facts) {
    const key = `${fact.alarmId} ${String(fact.occurrence)}`;
    const before = found.get(key);
    if (before !== undefined) found.set(key, { ...before, ...changeOf(fact, before) });
    else if (fact.fact === 'raised') found.set(key, raisedBy(fact, isMomentary(fact.alarmId)));
  }
  return [...found.values()];
}

const raisedBy = ({ alarmId, occurrence, at, words }: HistoryFact, momentary: boolean): Occurrence => ({
  ...{ alarmId, occurrence, raisedUtcMs: at, words },
  untilUtcMs: momentary ? at : null,
  ...{ seen: null, done: null, aside: null },
});

function changeOf({ fact, by, at: utcMs, words }: HistoryFact, { aside, untilUtcMs }: Occurrence): Partial<Occurrence> {
  if (fact === 'returned') return { untilUtcMs: utcMs };
  if (fact === 'acknowledged') return { seen: { by, utcMs } };
  if (fact === 'confirmed') return { done: { by, utcMs, note: words } };
  // What is put aside once it is over says nothing of this time.
  if (untilUtcMs !== null || aside !== null || !(hiding as readonly string[]).includes(fact)) return {};
  return { aside: { by, utcMs, why: words } };
}

/** Whether it stood at some time within the window; `toUtcMs` null: until now. */
export const stoodWithin = (
  { raisedUtcMs, untilUtcMs, aside }: Pick<Occurrence, 'raisedUtcMs' | 'untilUtcMs' | 'aside'>,
  { fromUtcMs, toUtcMs }: { fromUtcMs: number; toUtcMs: number | null },
): boolean => (toUtcMs === null || raisedUtcMs <= toUtcMs) && (untilUtcMs ?? aside?.utcMs ?? Number.POSITIVE_INFINITY) >= fromUtcMs;
