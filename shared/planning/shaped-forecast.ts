import { residualAtPeriod } from '../physics/shaped-swing';
import type { SwingStep } from '../protocol/document';
import { UnplayableStep } from '../protocol/durations';
import { relativePeriodU, settingOf, shapedOf, slewOf } from '../protocol/step-parts';
import type { RigDocument } from '../rig/document';

export interface ShapedForecast {
  /** Two or three. */
  moves: number;
  durationS: number;
  /** Ringing left by plan: amplitude over the step in the rest. */
  residual: number;
  /** The same if the period is 1 % longer than measured. */
  atOnePercent: number;
  /** The same if the period is longer by its standard uncertainty, and that uncertainty over the period; null where none is given. */
  atU: { residual: number; relativeU: number } | null;
}

/** What a shaped swing from an angle (deg) leaves by plan, and how that hangs on the period; null where there is none on the rig. */
export function shapedForecast(step: SwingStep, rig: RigDocument, fromDeg: number): ShapedForecast | null {
  try {
    const { moves, durationS, residual } = shapedOf(step, rig, fromDeg);
    const at = { setting: settingOf(rig), slew: slewOf(rig, step) };
    const relativeU = relativePeriodU(rig);
    return {
      moves: moves.length,
      durationS,
      residual,
      atOnePercent: residualAtPeriod(at, moves, 0.01),
      atU: relativeU === null || relativeU === 0 ? null : { residual: residualAtPeriod(at, moves, relativeU), relativeU },
    };
  } catch (error) {
    if (error instanceof UnplayableStep) return null;
    throw error;
  }
}
