import { inertiaKgM2 } from '../physics/oscillator';
import { geometryOf } from '../physics/torque';
import type { RigDocument } from '../rig/document';
import type { DwellWindow } from './dwell-windows';
import type { FreeOscillator } from './free-oscillator';
import type { Reversal } from './reversal';
import type { GSystem, MeasuredValues, RingDownFrequencies } from './solve-g';

/** What G needs to know of a fitted window. */
export interface PlacedSegment {
  window: Pick<DwellWindow, 'angleDeg' | 'stationKey'>;
  /** What the sources add to ω² there, rad2/s2. */
  shift: number;
}

export interface SystemInput {
  /** The rig as supposed. */
  rig: RigDocument;
  /** The rig as documented: where the supposed one has a station elsewhere, the achieved angles there move along. */
  stationsOf: RigDocument;
  segments: readonly PlacedSegment[];
  found: { ringDown: RingDownFrequencies | null } | null;
  measured: MeasuredValues;
  free: Pick<FreeOscillator, 'ringDownShare'>;
  reversal: Pick<Reversal, 'members' | 'value'> | null;
  /** Near minus far as another lever would read it, rad; absent: as fitted. */
  reversalRad?: number;
  /** The free pendulum as supposed; absent: from the ring-down and the measured values. */
  oscillator?: { periodS: number; decayTimeS: number };
}

/** The plain numbers that G follows from, for the rig as documented or for one supposed otherwise. Null without a source on the turntable. */
export function gSystem(input: SystemInput): GSystem | null {
  const { rig, segments, found, measured, free, reversal } = input;
  const geometry = geometryOf(rig);
  if (geometry.pairs.length === 0) return null;
  const angles = segments.map((segment) => angleRad(segment, input));
  const given = input.oscillator;
  return {
    geometry,
    inertiaKgM2: inertiaKgM2(rig),
    reversalRad: input.reversalRad ?? reversal?.value ?? 0,
    members: (reversal?.members ?? []).map(({ segment, weight }) => ({ phiRad: angles[segment] as number, weight })),
    oscillator:
      given === undefined
        ? {
            kind: 'combined',
            ringDown: found?.ringDown ?? null,
            measured,
            share: free.ringDownShare,
            segments: segments.map(({ shift }, i) => ({ phiRad: angles[i] as number, shift })),
          }
        : { kind: 'given', omega0Squared: ((2 * Math.PI) / given.periodS) ** 2 + given.decayTimeS ** -2, gamma: 1 / given.decayTimeS },
  };
}

function angleRad({ window }: PlacedSegment, { rig, stationsOf }: SystemInput): number {
  const key = window.stationKey;
  const moved = key === null ? 0 : (rig.stations[key]?.value ?? 0) - (stationsOf.stations[key]?.value ?? 0);
  return (((window.angleDeg ?? 0) + moved) * Math.PI) / 180;
}
