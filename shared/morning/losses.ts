import { alarmKinds } from '../alarms/catalog';
import { alarmOfHold } from '../alarms/of-holds';
import type { ChainedEvent, StepRow } from '../archive/run-records';
import type { MorningLoss } from '../contracts/morning';

/** Where the time of a night went that brought no data that count. */

export interface Loss {
  /** The same words for the same cause. */
  words: string;
  fromUtcMs: number;
  s: number;
  /** The whole reason, as the log has it. */
  reason: string;
  /** Row of the step log at which it began. */
  seq: number;
}

type LoggedRow = Pick<StepRow, 'seq' | 'kind' | 'startUtcMs' | 'endUtcMs' | 'outcome' | 'good'>;

const interruptions: Record<string, string> = {
  'link-lost': 'link to the controller lost',
  'server-restarted': 'server restarted',
  'lease-lapsed': 'another server took the run up',
  'database-away': 'database away',
};

const text = (value: unknown) => (typeof value === 'string' ? value : '');
const lower = (words: string) => words.charAt(0).toLowerCase() + words.slice(1);

function wordsOfHold(code: string): string {
  const alarm = alarmOfHold(code);
  return alarm === null ? 'held by a person' : alarm === 'held' ? 'held' : `held: ${lower(alarmKinds[alarm].title)}`;
}

/**
 * Every stretch in order of time: holds until the run went on or ended, interruptions that it overcame by itself, and dwells that do not
 * count. A dwell that a hold cut short counts as a dwell up to the hold and as a hold from there; an interruption that a dwell outlived
 * counts with the dwell, if that does not count.
 * @param end instant at which the run ended, or until which a hold that still lasts counts, UTC ms
 */
export function lossesOf(rows: readonly LoggedRow[], events: readonly ChainedEvent[], end: number): Loss[] {
  const rowAt = (utcMs: number) => rows.findLast((row) => row.startUtcMs <= utcMs)?.seq ?? rows[0]?.seq ?? 0;
  const losses: Loss[] = [];
  const add = (loss: Omit<Loss, 's' | 'seq'> & { toUtcMs: number; seq?: number }) => {
    const { toUtcMs, seq = rowAt(loss.fromUtcMs), ...rest } = loss;
    if (toUtcMs > loss.fromUtcMs) losses.push({ ...rest, seq, s: (toUtcMs - loss.fromUtcMs) / 1000 });
  };
  const outlived = (fromUtcMs: number, toUtcMs: number) =>
    rows.some(({ kind, startUtcMs, endUtcMs }) => kind === 'dwell' && startUtcMs <= fromUtcMs && endUtcMs !== null && endUtcMs >= toUtcMs);
  let held: ChainedEvent | null = null;
  const release = (toUtcMs: number) => {
    if (held === null) return;
    add({ words: wordsOfHold(text(held.data['code'])), fromUtcMs: Date.parse(held.at), toUtcMs, reason: text(held.data['reason']) });
    held = null;
  };
  for (const event of events) {
    const atUtcMs = Date.parse(event.at);
    if (event.kind === 'held') held = event;
    if (event.kind === 'stopped' || event.kind === 'failed' || event.kind === 'finished') release(atUtcMs);
    if (event.kind !== 'resumed') continue;
    const { gapS, cause } = event.data;
    if (held === null && typeof gapS === 'number') {
      const words = interruptions[text(cause)] ?? 'interrupted';
      const fromUtcMs = atUtcMs - 1000 * gapS;
      if (!outlived(fromUtcMs, atUtcMs)) add({ words, fromUtcMs, toUtcMs: atUtcMs, reason: words });
    }
    release(atUtcMs);
  }
  release(end);
  const reasons = new Map(events.filter(({ kind }) => kind === 'dwell-not-good').map(({ data }) => [data['seq'], data['why']]));
  for (const row of rows) {
    if (row.kind !== 'dwell' || row.endUtcMs === null || (row.good !== false && row.outcome === 'done')) continue;
    const why = reasons.get(row.seq);
    const reason =
      Array.isArray(why) && why.length > 0 ? why.map(String).join('; ') : row.outcome === 'done' ? 'not good' : (row.outcome ?? '');
    add({ words: 'dwells that do not count', fromUtcMs: row.startUtcMs, toUtcMs: row.endUtcMs, reason, seq: row.seq });
  }
  return losses.sort((a, b) => a.fromUtcMs - b.fromUtcMs);
}

/** The same, added up by cause, the greatest first. */
export function lostByCause(losses: readonly Loss[]): MorningLoss[] {
  const sums = new Map<string, number>();
  for (const { words, s } of losses) sums.set(words, (sums.get(words) ?? 0) + s);
  return [...sums].map(([words, s]) => ({ words, s })).sort((a, b) => b.s - a.s);
}
