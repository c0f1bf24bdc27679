import type { ArchiveWarning } from './archive-types';
import type { StepRow } from './run-records';

const mostNamed = 8;

/**
 * A warning where the step log says of dwells that their angle was counted only, not proved at the home edge or read by an encoder; none
 * where it does not say where its angles come from.
 */
export function unprovedDwells(stepText: string, steps: readonly StepRow[]): ArchiveWarning[] {
  const [header = ''] = stepText.split(/\r?\n/, 1);
  if (!/(^|,)"?angle_source"?(,|$)/.test(header)) return [];
  const unproved = steps.filter(({ kind, angleSource }) => kind === 'dwell' && angleSource === 'counted').map(({ seq }) => seq);
  if (unproved.length === 0) return [];
  const named = unproved.slice(0, mostNamed).join(', ') + (unproved.length > mostNamed ? ', …' : '');
  const message =
    unproved.length === 1
      ? `The angle of the dwell seq ${named} is not proved: it was counted, with no good pass of the home edge right before or with a slip after it.`
      : `The angles of ${unproved.length} dwells (seq ${named}) are not proved: they were counted, with no good pass of the home edge right before or with a slip after them.`;
  return [{ code: 'angle-unproved', message }];
}
