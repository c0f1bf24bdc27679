import type { StepRow } from '@/shared/archive/run-records';
import type { Draft } from './draft';
import type { RunContext } from './run-context';

/** Which dwells make a pair, as the run goes on: near and far, one after the other in the same pass of a repeat. */
export interface OpenPair {
  /** Path of the pass, `3.repeat[2]`; empty outside of repeats. */
  pass: string;
  /** The first dwell of the pair, which waits for the second; null: the next one begins a pair. */
  mate: StepRow | null;
  /** The first was skipped: the second makes no pair. */
  broken: boolean;
}

export const noPair: OpenPair = { pass: '', mate: null, broken: false };

const whyNotGood = ['the other dwell of its pair was skipped'];
const passOf = (path: string) => path.slice(0, path.lastIndexOf(']') + 1);

/** A pair never goes on from one pass into the next. */
function pairFor({ pair }: Pick<RunContext, 'pair'>, path: string): OpenPair {
  const pass = passOf(path);
  return pass === pair.pass ? pair : { ...noPair, pass };
}

/** A dwell has ended as planned: it opens a pair or completes one; the second of a broken pair is not good. */
export function noteDwellDone(draft: Draft, row: StepRow): void {
  const { pass, mate, broken } = pairFor(draft.context, row.path);
  draft.context.pair = { pass, mate: mate !== null || broken ? null : structuredClone(row), broken: false };
  if (!broken) return;
  if (row.good === true) noteUnpaired(draft.context);
  row.good = false;
  draft.log('dwell-not-good', { seq: row.seq, path: row.path, why: whyNotGood });
}

const noteUnpaired = (context: Pick<RunContext, 'dwellsUnpaired'>) => {
  context.dwellsUnpaired = (context.dwellsUnpaired ?? 0) + 1;
};

/** The dwell that would be left without its pair if this row's were skipped; null where there is none yet. */
export const mateOf = (context: Pick<RunContext, 'pair'>, row: Pick<StepRow, 'kind' | 'path'>): StepRow | null =>
  row.kind === 'dwell' ? pairFor(context, row.path).mate : null;

/** A dwell was skipped: its pair counts no more, whichever of the two it was. */
export function breakPair(draft: Draft, row: StepRow): void {
  const { context } = draft;
  const { pass, mate, broken } = pairFor(context, row.path);
  context.pair = { pass, mate: null, broken: mate === null && !broken };
  if (mate === null) return;
  for (const kept of context.position.dwells) if (kept.seq === mate.seq) kept.good = false;
  if (context.dwells.some(({ seq, good }) => seq === mate.seq && !good)) return;
  context.dwellsGood -= 1;
  noteUnpaired(context);
  context.dwells = context.dwells.map((dwell) => (dwell.seq === mate.seq ? { ...dwell, good: false } : dwell));
  draft.saveRow({ ...mate, good: false });
  draft.log('dwell-not-good', { seq: mate.seq, path: mate.path, why: whyNotGood });
}
