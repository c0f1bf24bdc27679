import type { ChannelLimit } from '@/shared/alarms/limits';
import { formatDuration } from '@/shared/lib/format-duration';

/** A limit as it is typed. */
export interface LimitDraft {
  kind: ChannelLimit['kind'];
  least: string;
  greatest: string;
  perH: string;
  span: string;
  /** Over how long slope and span are looked at, min. */
  windowMin: string;
  atMostS: string;
  forS: string;
  rings: ChannelLimit['rings'];
}

const windowsMin = { least: 1, most: 1440 };

/** What is wrong with the time over which slope and span are looked at, in its own unit. */
export function windowProblem({ windowMin }: Pick<LimitDraft, 'windowMin'>, read: (text: string) => number | null): string | undefined {
  const minutes = read(windowMin);
  if (minutes !== null && minutes >= windowsMin.least && minutes <= windowsMin.most) return undefined;
  return `${String(windowsMin.least)} to ${String(windowsMin.most)} min`;
}

/** The limit that was typed; null while a number is missing or is none. */
export function limitOf(draft: LimitDraft, read: (text: string) => number | null): ChannelLimit | null {
  const { kind, rings } = draft;
  const numberOr = (text: string) => (text.trim() === '' ? { ok: true, value: null } : { ok: read(text) !== null, value: read(text) });
  if (kind === 'silence') {
    const atMostS = read(draft.atMostS);
    return atMostS === null ? null : { kind, atMostS, rings };
  }
  const forS = read(draft.forS);
  if (forS === null) return null;
  if (kind === 'slope' || kind === 'span') {
    const [greatest, windowMin] = [read(kind === 'slope' ? draft.perH : draft.span), read(draft.windowMin)];
    if (greatest === null || windowMin === null || windowProblem(draft, read) !== undefined) return null;
    const more = { windowS: 60 * windowMin, deadBand: 0.02, forS, rings };
    return kind === 'slope' ? { kind, greatestPerH: greatest, ...more } : { kind, atMost: greatest, ...more };
  }
  const [least, greatest] = [numberOr(draft.least), numberOr(draft.greatest)];
  if (!least.ok || !greatest.ok || (least.value === null && greatest.value === null)) return null;
  return { kind, least: least.value, greatest: greatest.value, deadBand: 0.02, forS, rings };
}

export function limitWords(limit: ChannelLimit, unit: string): string {
  switch (limit.kind) {
    case 'level':
      if (limit.least === null) return `not above ${String(limit.greatest)} ${unit}`;
      if (limit.greatest === null) return `not below ${String(limit.least)} ${unit}`;
      return `${String(limit.least)} to ${String(limit.greatest)} ${unit}`;
    case 'slope':
      return `at most ${String(limit.greatestPerH)} ${unit} an hour, over ${formatDuration(limit.windowS)}`;
    case 'span':
      return `spans at most ${String(limit.atMost)} ${unit} in ${formatDuration(limit.windowS)}`;
    case 'silence':
      return `silent for at most ${formatDuration(limit.atMostS)}`;
  }
}
