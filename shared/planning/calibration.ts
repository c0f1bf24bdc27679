import { CODATA_2022_G, RAD_PER_DEG } from '../physics/constants';
import { equilibriumRad } from '../physics/equilibrium';
import type { Oscillator } from '../physics/oscillator';
import { geometryOf } from '../physics/torque';
import type { TimelineItem } from '../protocol/timeline';
import type { RigDocument } from '../rig/document';

/** A ring-down recorded after a kick: ω and γ are told from it. */
export interface Calibration {
  /** At its start. */
  amplitudeRad: number;
  lengthS: number;
}

/** The ring-downs of a plan, each as strong as the moves of its kick leave it: steps of the equilibrium in the middle of each move. */
export function calibrationsOf(items: readonly TimelineItem[], rig: RigDocument, { kappa, omegaD, gamma }: Oscillator): Calibration[] {
  const geometry = geometryOf(rig);
  const restRad = (angleDeg: number) => equilibriumRad({ geometry, kappa, bigG: CODATA_2022_G.value, phiRad: angleDeg * RAD_PER_DEG });
  const found: Calibration[] = [];
  let moves: TimelineItem[] = [];
  for (const item of items) {
    if (item.kind === 'kick' && item.part === 'move') moves.push(item);
    if (item.kind !== 'ring-down') continue;
    let [cosine, sine] = [0, 0];
    for (const { angleFromDeg, angleToDeg, startUtcMs, endUtcMs } of moves) {
      const sinceS = (item.startUtcMs - (startUtcMs + endUtcMs) / 2) / 1000;
      const left = (restRad(angleToDeg) - restRad(angleFromDeg)) * Math.exp(-gamma * sinceS);
      cosine += left * Math.cos(omegaD * sinceS);
      sine += left * Math.sin(omegaD * sinceS);
    }
    found.push({ amplitudeRad: Math.hypot(cosine, sine), lengthS: (item.endUtcMs - item.startUtcMs) / 1000 });
    moves = [];
  }
  return found;
}
