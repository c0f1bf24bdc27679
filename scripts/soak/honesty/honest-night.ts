import { buildArchive } from '@/shared/archive/build-archive';
import { readArchive } from '@/shared/archive/read-archive';
import type { StepRow } from '@/shared/archive/run-records';
import { evaluateArchive } from '@/shared/evaluation/evaluate-archive';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { CODATA_2022_G } from '@/shared/physics/constants';
import { seededStreams, type GaussianSource } from '@/shared/physics/seeded-gaussian';
import { createSimulatedBalance } from '@/shared/physics/simulated-balance';
import { trapezoid } from '@/shared/physics/trapezoid';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { Quantity, RigDocument } from '@/shared/rig/document';
import { studentTQuantile } from '@/shared/statistics/student-t';
import { sha256Hex } from '@/server/evaluation/sha256';

/**
 * Nights as they are: the rig differs from its document by what the document admits, the zero drifts and wanders, samples are missing,
 * people pass, and the channel's clock is wrong by an unknown amount.
 */

const cycleS = 840;
const rateHz = 0.2;
const startUtcMs = Date.UTC(2026, 0, 1);

export interface NightKind {
  dwells: number;
  /** u of lengths, masses and angles as a share of what the demo rig's document has. */
  geometry: number;
}

/**
 * Few dwells, enough of them to tell a zero that walks from noise (`wandering-zero.ts`), and the same on a rig measured so well that near minus far
 * decides: then the pulls judge its u and not that of the lengths.
 */
export const nightKinds = {
  few: { dwells: 12, geometry: 1 },
  many: { dwells: 28, geometry: 1 },
  wellMeasured: { dwells: 28, geometry: 0.02 },
} as const satisfies Record<string, NightKind>;

export interface HonestNight {
  result: EvaluationResult;
  /** (G − true G) / u */
  pull: number;
  /** Whether the true G lies within the 95 % interval. */
  inside: boolean;
}

export function honestNight(seed: number, { dwells, geometry }: NightKind): HonestNight {
  const [draw, samples] = seededStreams(seed, 2) as [GaussianSource, GaussianSource];
  // Neighbouring seeds begin alike; after a while the generator has forgotten that.
  for (let k = 0; k < 200; k += 1) draw.next();
  const { actual, documented } = rigs(draw, geometry);
  const ofStation = (rig: RigDocument, near: boolean) => rig.stations[near ? 'near' : 'far']?.value ?? 0;
  const anglesOf = (rig: RigDocument) => Array.from({ length: dwells + 1 }, (_, k) => ofStation(rig, k % 2 === 1));
  const truth = movesOf(anglesOf(actual));
  const balance = createSimulatedBalance({
    rig: actual,
    bigG: CODATA_2022_G.value,
    seed,
    rateHz,
    startUtcMs,
    startDeg: truth[0]?.fromDeg ?? 0,
  });
  const angleDegAt = (utcMs: number) => {
    const s = (utcMs - startUtcMs) / 1000;
    const k = Math.min(dwells - 1, Math.max(0, Math.floor(s / cycleS)));
    return (truth[k] as Move).angleDegAt(s - k * cycleS);
  };
  const { utcMs, value } = balance.advance({ toUtcMs: startUtcMs + dwells * cycleS * 1000, angleDegAt });
  const lateMs = 2000 * draw.next();
  const gaps = Array.from({ length: 4 }, () => startUtcMs + Math.abs(draw.next()) * 4e6);
  const kept = [...utcMs.keys()].filter((k) => !gaps.some((from) => (utcMs[k] as number) >= from && (utcMs[k] as number) < from + 60_000));
  const outlier = () => (samples.next() > 2.6 ? 2e-4 : 0);
  const channel = {
    info: { name: 'deflection', quantity: 'angle', unit: 'rad', role: 'deflection' as const },
    utcMs: Float64Array.from(kept, (k) => (utcMs[k] as number) + lateMs),
    value: Float64Array.from(kept, (k) => (value[k] as number) + outlier()),
  };
  return judged(evaluated(documented, { steps: movesOf(anglesOf(documented)).flatMap(rowsOf), channel }));
}

function judged(result: EvaluationResult): HonestNight {
  const { value, u, degreesOfFreedom } = result.G ?? { value: NaN, u: null, degreesOfFreedom: null };
  const pull = (value - CODATA_2022_G.value) / (u ?? NaN);
  return { result, pull, inside: Math.abs(pull) <= studentTQuantile(0.975, degreesOfFreedom ?? Infinity) };
}

/** The rig as it is and as its document says. */
function rigs(draw: GaussianSource, geometry: number): { actual: RigDocument; documented: RigDocument } {
  const documented = structuredClone(demoRigWide);
  for (const quantity of geometryIn(documented)) quantity.u *= geometry;
  documented.noise = { readout_rad: 5e-6, walk_rad_per_sqrt_min: 1e-6, drift_rad_per_h: 2e-5 * draw.next(), bursts_per_h: 1 };
  const actual = structuredClone(documented);
  for (const quantity of geometryIn(actual)) quantity.value += quantity.u * draw.next();
  delete documented.measured;
  return { actual, documented };
}

/** What is measured with a rule, a balance or a circle, in the order in which it is drawn. */
function geometryIn({ pendulum, sources, stations }: RigDocument): Quantity[] {
  return [
    pendulum.arm,
    pendulum.ballMass,
    pendulum.ballRadius,
    pendulum.beamMass,
    pendulum.beamLength,
    sources.mass,
    sources.orbit,
    sources.offset,
    stations.near,
    stations.far,
  ].filter((quantity) => quantity !== undefined);
}

type Move = ReturnType<typeof movesOf>[number];

function movesOf(anglesDeg: readonly number[]) {
  return anglesDeg.slice(1).map((toDeg, k) => {
    const fromDeg = anglesDeg[k] as number;
    return { k, fromDeg, toDeg, ...trapezoid({ fromDeg, toDeg, speedDegS: 6, accelerationDegS2: 2 }) };
  });
}

function rowsOf({ k, fromDeg, toDeg, durationS }: Move): StepRow[] {
  const row = (seq: number, kind: 'swing' | 'dwell', span: { fromS: number; toS: number; fromDeg: number }): StepRow => ({
    seq,
    path: `1.repeat[${k + 1}].${kind}`,
    kind,
    label: '',
    station: toDeg > 0 ? 'near' : 'far',
    plannedStartUtcMs: startUtcMs + span.fromS * 1000,
    plannedEndUtcMs: startUtcMs + span.toS * 1000,
    startUtcMs: startUtcMs + span.fromS * 1000,
    endUtcMs: startUtcMs + span.toS * 1000,
    uStartS: 1e-4,
    uEndS: 1e-4,
    angleStartDeg: span.fromDeg,
    angleEndDeg: toDeg,
    outcome: 'done',
    angleSource: 'edge-verified',
    uAngleDeg: 0.01,
    good: kind === 'dwell' ? true : null,
  });
  const [begin, still, end] = [k * cycleS, k * cycleS + durationS, (k + 1) * cycleS];
  return [
    row(2 * k + 1, 'swing', { fromS: begin, toS: still, fromDeg }),
    row(2 * k + 2, 'dwell', { fromS: still, toS: end, fromDeg: toDeg }),
  ];
}

type Channel = Parameters<typeof buildArchive>[0]['channels'][number];

function evaluated(rig: RigDocument, { steps, channel }: { steps: StepRow[]; channel: Channel }): EvaluationResult {
  const run = {
    runId: 'honesty',
    outcome: 'finished' as const,
    operator: 'soak',
    startedAtUtcMs: startUtcMs,
    endedAtUtcMs: null,
    notes: '',
    massSetLabel: '',
    simulated: null,
  };
  const protocol = { formatVersion: 1 as const, name: 'Honesty', steps: [{ kind: 'home' as const }] };
  const records = { run, rig, protocol, steps, events: [], channels: [channel], createdAt: '2026-01-02T00:00:00.000Z', software: 'soak' };
  return evaluateArchive(readArchive(buildArchive(records, sha256Hex), sha256Hex)).result;
}
