import type { IconName, Tone } from '@/components/ui';
import type { AlarmHopView, AlarmView, RunAlarm } from '@/shared/contracts/alarms';
import { formatClock, formatDay } from '@/shared/lib/format-time';

/** Alarms in words: state by word, shape and colour. */

export const stateWords: Record<AlarmView['state'], string> = {
  normal: 'over',
  'active-unacknowledged': 'not acknowledged',
  'active-acknowledged': 'acknowledged, still there',
  'returned-unacknowledged': 'gone, not acknowledged',
  latched: 'latched: to be reset',
  shelved: 'shelved',
  suppressed: 'suppressed',
  'out-of-service': 'out of service',
};

export const priorityWords: Record<AlarmView['priority'], string> = { high: 'High', medium: 'Medium', low: 'Low' };

export const ringsWords: Record<AlarmView['rings'], string> = {
  always: 'Rings at any hour, one person after the other, until somebody acknowledges.',
  allowed: 'Rings whoever is not in the hours of “do not ring”.',
  morning: 'Is told by day, or in the morning.',
  never: 'Stands on the screens and rings nobody.',
};

export const factWords: Readonly<Record<string, string>> = {
  raised: 'Raised',
  returned: 'Condition went away',
  acknowledged: 'Acknowledged',
  confirmed: 'Answer done',
  latched: 'Latched',
  reset: 'Reset',
  shelved: 'Shelved',
  unshelved: 'Back from the shelf',
  suppressed: 'Suppressed',
  unsuppressed: 'No longer suppressed',
  'taken-out': 'Taken out of service',
  'returned-to-service': 'Returned to service',
};

const hopWords = ({ means, outcome }: Pick<AlarmHopView, 'means' | 'outcome'>): string => {
  if (means === 'none') return 'not told';
  const what = means === 'push' ? 'push message' : 'mail';
  return { sent: `${what} sent`, failed: `${what} failed`, 'not-set-up': `no ${what}` }[outcome];
};

export interface HopGroup {
  seq: number;
  at: string;
  name: string;
  words: string;
  details: string;
}

/** What went to one person at one time as one line, newest first; a way that is not set up matters only where nothing else went. */
export function hopGroups(hops: readonly AlarmHopView[]): HopGroup[] {
  const groups = new Map<string, AlarmHopView[]>();
  for (const hop of hops) groups.set(`${hop.at} ${hop.name}`, [...(groups.get(`${hop.at} ${hop.name}`) ?? []), hop]);
  return [...groups.values()].flatMap((group) => {
    const [first] = group;
    if (first === undefined) return [];
    const told = group.some(({ outcome }) => outcome === 'sent');
    const shown = group.filter(({ outcome }) => !told || outcome !== 'not-set-up');
    const details = [...new Set(shown.map(({ detail }) => detail).filter((detail) => detail !== ''))].join('; ');
    return [{ seq: first.seq, at: first.at, name: first.name, words: shown.map(hopWords).join(', '), details }];
  });
}

/** Whether it stands on every screen: a condition that is hidden does not. */
export const isShown = ({ state }: AlarmView): boolean => !['normal', 'shelved', 'suppressed', 'out-of-service'].includes(state);
export const isUnacknowledged = ({ state }: AlarmView): boolean => state === 'active-unacknowledged' || state === 'returned-unacknowledged';

const weights = { high: 0, medium: 1, low: 2 } as const;

/** The most pressing first: not acknowledged, then by priority, then the newest. */
export const byUrgency = (one: AlarmView, other: AlarmView): number =>
  Number(isUnacknowledged(other)) - Number(isUnacknowledged(one)) ||
  weights[one.priority] - weights[other.priority] ||
  (other.raisedAt ?? '').localeCompare(one.raisedAt ?? '');

export const markOf = (alarm: AlarmView): { icon: IconName; tone: Tone } => {
  if (!isShown(alarm)) return { icon: 'other', tone: 'dim' };
  if (!isUnacknowledged(alarm)) return { icon: 'note', tone: 'lamp' };
  return { icon: 'warning', tone: alarm.priority === 'high' ? 'danger' : 'lamp' };
};

export const placeOf = ({ rigName }: { rigName: string | null }): string => rigName ?? 'the whole lab';

/** `21:03:12` today, else with the day. */
export function whenWords(iso: string, { timeZone, nowIso }: { timeZone: string; nowIso: string }): string {
  const at = Date.parse(iso);
  const clock = formatClock(at, { timeZone, precision: 'seconds' });
  const day = formatDay(at, timeZone);
  return day === formatDay(Date.parse(nowIso), timeZone) ? clock : `${day} ${clock}`;
}

const unpointed = (sentence: string) => sentence.replace(/\.$/, '');

/** How long an alarm of a run stood, whom it was told, who saw it and what was done, each in a few words; `when` names an instant. */
export function runAlarmFacts({ raisedAt, untilAt, told, seen, done, aside }: RunAlarm, when: (iso: string) => string): string[] {
  const still =
    aside === null ? 'still there' : `put aside ${when(aside.at)}${aside.by === '' ? '' : ` by ${aside.by}`}: ${unpointed(aside.why)}`;
  return [
    ...(untilAt === raisedAt ? [] : [untilAt === null ? still : `until ${when(untilAt)}`]),
    told.length === 0 ? 'nobody was told' : `told ${told.join(', ')}`,
    seen === null ? 'seen by nobody' : `seen by ${seen.by} ${when(seen.at)}`,
    ...(done === null ? [] : [`done by ${done.by} ${when(done.at)}${done.note === '' ? '' : `: ${unpointed(done.note)}`}`]),
  ];
}
