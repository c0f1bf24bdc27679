import type { StepRow } from '../archive/run-records';
import type { FrameMoment } from '../contracts/cameras';
import type { ProtocolDocument } from '../protocol/document';
import { parseStepPath, stepAt } from '../protocol/step-path';

/** A moment of a run at which cameras are asked for a frame. */
export interface AskedFrame {
  /** Row of the step log. */
  seq: number;
  moment: FrameMoment;
  utcMs: number;
}

/**
 * The moments among rows of the step log as they were saved: both ends of each swing, and marks that ask for a frame. `seen` holds
 * those of before, as `seq moment`, and is added to: a row is saved again whenever it changes.
 */
export function momentsIn(rows: readonly StepRow[], protocol: Pick<ProtocolDocument, 'steps'>, seen: Set<string>): AskedFrame[] {
  const found = rows.flatMap((row) => momentsOf(row, protocol)).filter(({ seq, moment }) => !seen.has(`${String(seq)} ${moment}`));
  for (const { seq, moment } of found) seen.add(`${String(seq)} ${moment}`);
  return found;
}

function momentsOf({ seq, kind, path, startUtcMs, endUtcMs }: StepRow, protocol: Pick<ProtocolDocument, 'steps'>): AskedFrame[] {
  if (kind === 'mark') {
    const positions = parseStepPath(path);
    const step = positions === null ? null : stepAt(protocol, positions);
    return step?.kind === 'mark' && step.frame === true ? [{ seq, moment: 'mark', utcMs: startUtcMs }] : [];
  }
  if (kind !== 'swing') return [];
  const began: AskedFrame = { seq, moment: 'swing-began', utcMs: startUtcMs };
  return endUtcMs === null ? [began] : [began, { seq, moment: 'swing-ended', utcMs: endUtcMs }];
}
