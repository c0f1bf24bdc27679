import { buildArchive } from '@/shared/archive/build-archive';
import { readArchive } from '@/shared/archive/read-archive';
import { evaluateArchive } from '@/shared/evaluation/evaluate-archive';
import { CODATA_2022_G, RAD_PER_DEG } from '@/shared/physics/constants';
import { equilibriumRad } from '@/shared/physics/equilibrium';
import { oscillatorOf, type Oscillator } from '@/shared/physics/oscillator';
import { geometryOf } from '@/shared/physics/torque';
import { differenceU, type Cadence } from '@/shared/planning/night-noise';
import { cadenceOf, type Alternative } from '@/shared/planning/strategies';
import { checkProtocol } from '@/shared/protocol/check';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { predictSignal } from '@/shared/protocol/predict';
import { planTimeline } from '@/shared/protocol/timeline';
import type { RigDocument } from '@/shared/rig/document';
import { rehearsalParts } from '@/server/boot/rehearsal-parts';
import { rehearse, type Rehearsal } from '@/server/engine/rehearsal/rehearse';
import { sha256Hex } from '@/server/evaluation/sha256';
import { plannedRigs } from './dwell-nights';

/**
 * The same rigs and strategies through everything: planned as a protocol, rehearsed by the engine on the simulated rig, archived, evaluated.
 * Read once a second, with noise that says as much a second as the planner's ten readings do.
 */

const nightS = 12 * 3600;
const nightsOfEach = 3;
const startUtcMs = Date.UTC(2026, 0, 1);
const plannedRateHz = 10;

export interface ChainNights {
  rig: string;
  strategy: Alternative['strategy'];
  dwells: number;
  /** Uncertainty that the evaluation found for near minus far, root mean square of the nights, by the planned one. */
  uRatio: number;
  /** Near minus far less the true difference, each by the planned uncertainty. */
  pulls: number[];
}

/** Every strategy on every rig that can move so, with three nights each. */
export async function throughTheChain(): Promise<ChainNights[]> {
  const found: ChainNights[] = [];
  for (const [name, rig] of Object.entries(plannedRigs)) {
    for (const strategy of ['plain', 'shaped', 'wait'] as const) found.push(await nightsOf(name, rig, strategy));
  }
  return found;
}

async function nightsOf(name: string, rig: RigDocument, strategy: Alternative['strategy']): Promise<ChainNights> {
  const protocol = protocolOf(oscillatorOf(rig) as Oscillator, strategy);
  const start = { utcMs: startUtcMs, angleDeg: rig.motion?.homeDeg ?? 0 };
  const refusals = checkProtocol(protocol, rig, start);
  if (refusals.length > 0) throw new Error(`${name}, ${strategy}: ${JSON.stringify(refusals[0])}`);
  const cadence = cadenceOf(planTimeline({ protocol, rig, timeZone: 'UTC' }, start), rig) as Cadence;
  const planned = differenceU(rig, cadence, predictSignal(rig)?.signalRad ?? NaN) as number;
  const nights = [];
  for (let seed = 1; seed <= nightsOfEach; seed += 1) nights.push(await oneNight(rig, protocol, seed));
  return {
    rig: name,
    strategy,
    dwells: cadence.dwells,
    uRatio: Math.sqrt(nights.reduce((sum, { u }) => sum + u * u, 0) / nightsOfEach) / planned,
    pulls: nights.map(({ error }) => error / planned),
  };
}

/** The cadence of `dwell-nights.ts` as a protocol of about twelve hours. */
function protocolOf({ periodS, gamma }: Oscillator, strategy: Alternative['strategy']): ProtocolDocument {
  const calmS = Math.round(Math.log(100) / gamma);
  const swing = (to: string): Step => ({ kind: 'swing', to, ...(strategy === 'shaped' ? { profile: 'shaped' as const } : {}) });
  const beats = strategy === 'shaped' ? 2 : 1;
  const stand: Step[] =
    strategy === 'wait'
      ? [
          { kind: 'settle', for_s: calmS },
          { kind: 'dwell', periods: 1 },
        ]
      : [{ kind: 'dwell', beat_periods: beats }];
  const pairS = 2 * (strategy === 'wait' ? calmS + periodS + 20 : beats * periodS);
  return {
    formatVersion: 1,
    name: strategy,
    steps: [
      { kind: 'home' },
      swing('near'),
      { kind: 'kick', amplitude_urad: 5000, periods: 10 },
      { kind: 'repeat', times: Math.floor(nightS / pairS), steps: [swing('far'), ...stand, swing('near'), ...stand] },
    ],
  };
}

async function oneNight(rig: RigDocument, protocol: ProtocolDocument, seed: number): Promise<{ u: number; error: number }> {
  const simulated = { trueG: CODATA_2022_G.value, seed, rateHz: 1, faults: [] };
  const noise = { ...rig.noise, readout_rad: (rig.noise?.readout_rad ?? 0) / Math.sqrt(plannedRateHz) };
  const start = {
    labId: 'soak',
    runId: 'planner',
    rigId: 'simulated-rig',
    rigName: 'Simulated rig',
    rigRevision: 1,
    protocolName: protocol.name,
    protocolRevision: 1,
    rig: { ...rig, noise },
    protocol,
    massSetLabel: '',
    timeZone: 'UTC',
    operator: 'soak',
    notes: '',
    arm: null,
    simulated,
  };
  const { outcome, steps, events, channels, startedAtUtcMs, endedAtUtcMs } = await rehearse({ start, startUtcMs }, rehearsalParts());
  const files = buildArchive(
    {
      run: { runId: 'planner', outcome, operator: 'soak', startedAtUtcMs, endedAtUtcMs, notes: '', massSetLabel: '', simulated },
      rig,
      protocol,
      steps,
      events,
      channels,
      createdAt: new Date(endedAtUtcMs).toISOString(),
      software: 'soak',
    },
    sha256Hex,
  );
  const { reversal_rad: reversal } = evaluateArchive(readArchive(files, sha256Hex)).result;
  return { u: reversal?.u ?? NaN, error: (reversal?.value ?? NaN) - trueDifferenceRad(rig, steps) };
}

/** Of the equilibria at the angles that were reached. */
function trueDifferenceRad(rig: RigDocument, steps: Rehearsal['steps']): number {
  const { kappa } = oscillatorOf(rig) as Oscillator;
  const restAt = (station: string) => {
    const angleDeg = steps.find((row) => row.kind === 'dwell' && row.station === station)?.angleEndDeg ?? NaN;
    return equilibriumRad({ geometry: geometryOf(rig), kappa, bigG: CODATA_2022_G.value, phiRad: angleDeg * RAD_PER_DEG });
  };
  return restAt('near') - restAt('far');
}
