import type { RigDocument } from '../rig/document';
import type { ProtocolDocument } from './document';
import type { Finding } from './finding';
import { walkSteps } from './step-path';
import { greatestPeriodU, relativePeriodU, shapedMoveCount } from './step-parts';

/** `shaped-period-unknown`: two moves want the period to 0.7 % (physics of the two-move shaper: 1.4 % of the step for 1 % of the period). */
export function shapedPeriodUnknown({ steps }: Pick<ProtocolDocument, 'steps'>, rig: RigDocument): Finding[] {
  const first = [...walkSteps(steps)].find(({ step }) => step.kind === 'swing' && step.profile === 'shaped');
  const u = relativePeriodU(rig);
  if (first === undefined || (u !== null && shapedMoveCount(rig) === 2)) return [];
  const percent = 100 * greatestPeriodU;
  const message =
    u === null
      ? `The period of this rig is not measured, and a shaped swing in two moves wants it to ${percent} %. Measure it by a kick and its ring-down after a plain swing first.`
      : `The period of this rig is known to ${(100 * u).toPrecision(2)} %, and a shaped swing in two moves wants it to ${percent} %, so it is made in three, half a period longer. ` +
        'Measure the period by a kick and its ring-down, or give the dwells a beat of three periods.';
  return [{ code: 'shaped-period-unknown', path: first.path, message }];
}
