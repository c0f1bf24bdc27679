import { reversalSoFar } from '@/shared/conditions/relative-u';
import type { CursorMoment } from '@/shared/protocol/cursor';
import type { Draft } from './draft';
import type { RunContext } from './run-context';

/** What the dwells of a run say while it goes on: whether they are good, and how well near minus far is known. */

/** Facts of more dwells than this are not kept: the scatter of the last ones says enough. */
const MOST_DWELLS = 400;

/** Asks for the samples of the present dwell, a little before it ends. */
export function lookAtDwell(draft: Draft, toUtcMs: number): void {
  const { context } = draft;
  const { row } = draft.step;
  context.judging = row.seq;
  const { swungFromDeg, dwells, moment } = context;
  const before = dwells.findLast(({ seq }) => seq < row.seq) ?? null;
  draft.look({ kind: 'dwell', seq: row.seq, fromUtcMs: row.startUtcMs, toUtcMs, angleDeg: moment.angleDeg, swungFromDeg, before });
}

/** Taken down only before the next move is sent: from then on it is decided whether another pass begins. */
export function noteDwellLook(draft: Draft): void {
  const { finding } = draft.told('looked');
  const { context } = draft;
  if (finding?.kind !== 'dwell' || context.ahead !== null || finding.facts.seq !== context.step?.row.seq) return;
  context.dwells = [...context.dwells.filter(({ seq }) => seq !== finding.facts.seq), finding.facts].slice(-MOST_DWELLS);
}

/** So many good dwells, one after the other, show that what was wrong before is over (an estimate, no source). */
const GOOD_AGAIN = 4;

export const lastAreGood = (dwells: RunContext['dwells']): boolean =>
  dwells.length >= GOOD_AGAIN && dwells.slice(-GOOD_AGAIN).every(({ good }) => good);

/** So many dwells without deflection, one after the other, and the run holds: what follows would be lost as well. */
const MOST_SILENT = 2;

/** Why the dwells that ended last ask for a hold; null where they do not, or where a person has resumed since. */
export function holdOfDwells({ context }: Draft): { code: string; text: string; seq: number } | null {
  const since = context.dwells.filter(({ seq }) => seq > (context.heldForDwell ?? 0));
  const last = since.at(-1);
  if (last === undefined) return null;
  if (last.noResponse !== null)
    return { code: 'no-response', seq: last.seq, text: `In the dwell of row ${last.seq} ${last.noResponse}. It may touch, or be caged.` };
  if (last.excursion !== null)
    return {
      code: 'excursion',
      seq: last.seq,
      text: `In the dwell of row ${last.seq} ${last.excursion}. The sources stay where they are: look at the strip, and resume when it has decayed.`,
    };
  const silent = since.slice(-MOST_SILENT);
  if (silent.length < MOST_SILENT || !silent.every((dwell) => dwell.silent)) return null;
  const text = `The deflection was silent in ${MOST_SILENT} dwells one after the other. Look at laser, camera and the computer that records, then resume.`;
  return { code: 'no-deflection', seq: last.seq, text };
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
