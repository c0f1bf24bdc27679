import { reversalSoFar } from '@/shared/conditions/relative-u';
import type { CursorMoment } from '@/shared/protocol/cursor';
import type { Draft } from './draft';

/** What the dwells of a run say while it goes on: whether they are good, and how well near minus far is known. */

/** Facts of more dwells than this are not kept: the scatter of the last ones says enough. */
const MOST_DWELLS = 400;

/** Asks for the samples of the present dwell, a little before it ends. */
export function lookAtDwell(draft: Draft, toUtcMs: number): void {
  const { context } = draft;
  const { row } = draft.step;
  context.judging = row.seq;
  draft.look({ kind: 'dwell', seq: row.seq, fromUtcMs: row.startUtcMs, toUtcMs, angleDeg: context.moment.angleDeg });
}

/** Taken down only before the next move is sent: from then on it is decided whether another pass begins. */
export function noteDwellLook(draft: Draft): void {
  const { finding } = draft.told('looked');
  const { context } = draft;
  if (finding?.kind !== 'dwell' || context.ahead !== null || finding.facts.seq !== context.step?.row.seq) return;
  context.dwells = [...context.dwells.filter(({ seq }) => seq !== finding.facts.seq), finding.facts].slice(-MOST_DWELLS);
}

/** The moment at which the cursor goes on: now, or at the end of the present dwell. */
export function cursorMoment({ context }: Draft, utcMs: number = context.moment.utcMs): CursorMoment {
  const { step, dwells, dwellJustNotGood } = context;
  const open = step?.row.kind === 'dwell' && step.row.outcome === null ? dwells.find(({ seq }) => seq === step.row.seq) : undefined;
  return {
    utcMs,
    angleDeg: context.moment.angleDeg,
    notGood: open === undefined ? dwellJustNotGood : !open.good,
    relativeU: reversalSoFar(dwells)?.relativeU ?? null,
  };
}
