import type { Archive } from '../archive/read-archive';
import { UnusableArchive } from '../archive/unusable-archive';
import { CODATA_2022_G } from '../physics/constants';
import { leverOf } from '../physics/lever';
import { inertiaKgM2 } from '../physics/oscillator';
import { Pendulum } from '../physics/pendulum';
import { steadyAt, steadyRotation } from '../physics/steady-rotation';
import { geometryOf } from '../physics/torque';
import type { RigDocument } from '../rig/document';
import { biweight, huberWeight, robustScale } from '../statistics/robust';
import type { Analysis } from './analysis';
import { reread, spotOfAngle, withZero, type ChannelScale } from './channel-scale';
import type { ClockOffset } from './clock-offset';
import { samplesIn } from './dwell-samples';
import type { Known } from './free-oscillator';
import {
  expectedHarmonics,
  gaussStep,
  harmonicsModel,
  solveModulation,
  type ModulationSolution,
  type RotatingPendulum,
} from './modulation-solution';
import { fitRotation, harmonicsByPiece, recordOf, turnsThere, type RotationFit, type RotationRecord } from './rotation-fit';
import { rotationWindows } from './rotation-windows';
import type { GSolution } from './solve-g';

/**
 * The modulation method: sources that turn at a constant rate, the deflection locked to twice their angle and its multiples, and G from the
 * harmonics by the exact torque and the pendulum's transfer function (physics.md B6).
 */
export interface ModulationOutcome {
  solution: GSolution;
  /** Of G, from the scatter between turns; null with fewer than two. */
  statistical: Known | null;
  /** From the phase; null with fewer than two turns. */
  clockOffset: ClockOffset | null;
  turns: number;
  /** Half the swing at twice the turntable's angle, rad. */
  amplitudeRad: number;
  /** G of the same record for a rig or a pendulum supposed otherwise. */
  gOf(changes: { rig?: RigDocument; periodS?: number; decayTimeS?: number }): number;
}

/** Rounds in which the exact motion is fitted like the record, until G stands still. */
const mostRounds = 8;
const settled = 1e-10;
/** A greater lateness is taken off before the record is fitted again, s. */
const unnoticedS = 1;

/** @throws UnusableArchive without a whole turn at a constant rate */
export function modulationOutcome(archive: Archive, channel: string, analysis: Analysis): ModulationOutcome {
  const rotations = rotationWindows(archive.steps, archive.rig);
  if (rotations.length === 0)
    throw new UnusableArchive(
      { file: 'steps.csv' },
      'the method "modulation" needs a rotation: a row of the kind rotate with a whole turn at least between its ramps, and the angles of both its ends',
    );
  const known = analysis.clockOffset;
  const offsetS = known !== null && Math.abs(known.value) > Math.max(2 * known.u, unnoticedS) ? known.value : 0;
  try {
    const first = locked(archive, channel, { analysis, offsetS });
    const { latenessS } = first.solution;
    return Math.abs(latenessS) > unnoticedS
      ? outcomeOf(archive.rig, analysis, locked(archive, channel, { analysis, offsetS: offsetS + latenessS }))
      : outcomeOf(archive.rig, analysis, first);
  } catch (error) {
    if (error instanceof UnusableArchive) throw error;
    throw new UnusableArchive({ file: 'steps.csv' }, `the rotation cannot be evaluated: ${error instanceof Error ? error.message : ''}`);
  }
}

interface Locked {
  records: RotationRecord[];
  fits: RotationFit[];
  /** What the linear fit makes of the exact motion beyond its harmonics. */
  biases: Float64Array[];
  trust: (Float64Array | null)[];
  solution: ModulationSolution;
  scale: ChannelScale;
  offsetS: number;
}

function locked(archive: Archive, channel: string, { analysis, offsetS }: { analysis: Analysis; offsetS: number }): Locked {
  const series = archive.readChannel(channel);
  const inLogTime = { ...series, utcMs: offsetS === 0 ? series.utcMs : series.utcMs.map((ms) => ms - 1000 * offsetS) };
  const rotations = rotationWindows(archive.steps, archive.rig);
  const samples = rotations.map(({ window }) => samplesIn(window, inLogTime, archive.exclusions));
  const pendulum = pendulumOf(archive.rig, analysis);
  const free = { omega: (2 * Math.PI) / pendulum.oscillator.periodS, gamma: pendulum.oscillator.gamma };
  const recordsOn = (scale: ChannelScale) =>
    rotations.map((rotation, i) => recordOf(samples[i] as (typeof samples)[number], rotation, { scale, free }));
  let scale = analysis.segments.length > 0 ? analysis.scale : withZero(analysis.scale, meanSpotM(analysis.scale, samples));
  let records = recordsOn(scale);
  const plainFit = (record: RotationRecord, trust: Float64Array | null) =>
    fitRotation(record, { y: record.averages.y, columns: record, trust });
  if (scale.kind === 'spot' && !scale.zeroGiven && analysis.segments.length === 0) {
    scale = withZero(scale, spotOfAngle(scale, meanOf(records.map((record) => plainFit(record, null).offsetRad))));
    records = recordsOn(scale);
  }
  let trust: (Float64Array | null)[] = records.map(() => null);
  let fits = records.map((record) => plainFit(record, null));
  let biases = fits.map(({ harmonics }) => harmonics.map(() => 0));
  let ringing = fits.map((fit) => fit.ringing);
  let solution = solved(records, { fits, biases, pendulum, startG: CODATA_2022_G.value });
  for (let round = 0; round < mostRounds; round += 1) {
    const before = solution.bigG;
    const simulated = records.map((record, i) => {
      const put = ringing[i] as [number, number];
      const y = exactMotion(record, pendulum, { bigG: before, ringing: put });
      return { put, fit: fitRotation(record, { y, columns: record.atMiddle, trust: trust[i] ?? null }) };
    });
    biases = records.map(({ rotation }, i) => {
      const expected = expectedHarmonics(pendulum, before, rotation.speedRadS);
      return (simulated[i] as (typeof simulated)[number]).fit.harmonics.map((value, k) => value - (expected[k] as number));
    });
    ringing = simulated.map(({ put, fit }, i) => {
      const own = (fits[i] as RotationFit).ringing;
      return [own[0] - fit.ringing[0] + put[0], own[1] - fit.ringing[1] + put[1]];
    });
    const judged = trustOf(records, fits, { simulated: simulated.map(({ fit }) => fit), round });
    solution = solved(records, { fits, biases, pendulum, startG: before });
    if (judged === null && Math.abs(solution.bigG - before) <= settled * Math.abs(before)) break;
    if (judged === null) continue;
    // A rotation of which nothing is trusted any more is left out, where another is left.
    const left = [...records.keys()].filter((i) => turnsThere(records[i] as RotationRecord, judged[i] ?? null) > 0);
    if (left.length === 0) break;
    const ofThese = <T>(all: readonly T[]) => left.map((i) => all[i] as T);
    [records, trust, biases, ringing] = [ofThese(records), ofThese(judged), ofThese(biases), ofThese(ringing)];
    fits = records.map((record, i) => plainFit(record, trust[i] ?? null));
  }
  return { records, fits, biases, trust, solution, scale, offsetS };
}

function pendulumOf(rig: RigDocument, { free }: Analysis): RotatingPendulum {
  const inertia = inertiaKgM2(rig);
  const omega0Squared = free.omega0Squared.value;
  const gamma = free.gamma.value;
  return {
    geometry: geometryOf(rig),
    oscillator: {
      inertiaKgM2: inertia,
      kappa: inertia * omega0Squared,
      gamma,
      periodS: (2 * Math.PI) / Math.sqrt(omega0Squared - gamma * gamma),
    },
  };
}

const meanOf = (values: readonly number[]) => values.reduce((sum, one) => sum + one, 0) / values.length;

function meanSpotM(scale: ChannelScale, samples: readonly { reading: Float64Array }[]): number {
  if (scale.kind === 'angle') return 0;
  if (scale.zeroGiven) return scale.lever.zeroM;
  return (
    scale.metresPerUnit * meanOf(samples.map(({ reading }) => reading.reduce((sum, one) => sum + one, 0) / Math.max(1, reading.length)))
  );
}

function solved(
  records: readonly RotationRecord[],
  { fits, biases, pendulum, startG }: Pick<Locked, 'fits' | 'biases'> & { pendulum: RotatingPendulum; startG: number },
): ModulationSolution {
  return solveModulation(observedOf(records, fits, biases), pendulum, startG);
}

const observedOf = (records: readonly RotationRecord[], fits: readonly RotationFit[], biases: readonly Float64Array[]) =>
  records.map(({ rotation: { speedRadS, turns } }, i) => ({
    harmonics: (fits[i] as RotationFit).harmonics.map((value, k) => value - (biases[i]?.[k] as number)),
    speedRadS,
    turns,
  }));

/** The motion by the exact equation at the middle of each box, from the state that the fit gives the first one. */
function exactMotion(
  { averages: { t }, rotation }: RotationRecord,
  pendulum: RotatingPendulum,
  { bigG, ringing: [a, b] }: { bigG: number; ringing: readonly [number, number] },
): Float64Array {
  const { gamma, periodS } = pendulum.oscillator;
  const omega = (2 * Math.PI) / periodS;
  const startS = t[0] as number;
  const phiAt = (atS: number) => rotation.phiRad(rotation.window.fromUtcMs + 1000 * atS);
  const { angleRad, slope } = steadyAt(steadyRotation({ ...pendulum, bigG }, rotation.speedRadS), phiAt(startS));
  const [c, s] = [Math.exp(-gamma * startS) * Math.cos(omega * startS), Math.exp(-gamma * startS) * Math.sin(omega * startS)];
  const initial = {
    angleRad: angleRad + a * c + b * s,
    speedRadS: slope * rotation.speedRadS + a * (-gamma * c - omega * s) + b * (-gamma * s + omega * c),
  };
  const exact = new Pendulum({ ...pendulum, bigG, stepInMotionS: periodS / stepsPerPeriod }, initial, startS);
  return t.map((atS, i) => {
    if (i > 0) exact.advanceTo(atS, phiAt);
    return exact.angleRad;
  });
}

const stepsPerPeriod = 600;
/** Residuals are judged only where one of them leaves the scale this far. */
const noticed = 6;
/** Residuals below this share of the motion are rounding. */
const roundingShare = 1e-7;
const judgements = 4;

/** How far each datum is trusted by what the fit leaves of it beyond what it leaves of the exact motion; null where none stands out, or later. */
function trustOf(
  records: readonly RotationRecord[],
  fits: readonly RotationFit[],
  { simulated, round }: { simulated: readonly RotationFit[]; round: number },
): Float64Array[] | null {
  if (round >= judgements) return null;
  const excess = fits.map(({ residuals }, i) =>
    residuals.map((value, k) => (value - (simulated[i]?.residuals[k] ?? 0)) * Math.sqrt(records[i]?.averages.weight[k] ?? 1)),
  );
  const pooled = Float64Array.from(excess.flatMap((one) => [...one]));
  const motion = Math.max(...fits.map(({ harmonics }) => Math.hypot(...harmonics)));
  const scale = Math.max(robustScale(pooled), roundingShare * motion * Math.sqrt(Math.max(...(records[0]?.averages.weight ?? [1]))));
  if (round === 0 && !pooled.some((value) => Math.abs(value) > noticed * scale)) return null;
  const weight = round < 2 ? huberWeight : biweight;
  return excess.map((one) => one.map((value) => weight(value / scale)));
}

function outcomeOf(rig: RigDocument, analysis: Analysis, found: Locked): ModulationOutcome {
  const { records, fits, biases, solution, scale, offsetS } = found;
  const { free } = analysis;
  const pendulum = pendulumOf(rig, analysis);
  const observed = observedOf(records, fits, biases);
  const amplitudeRad = Math.hypot(observed[0]?.harmonics[0] ?? 0, observed[0]?.harmonics[1] ?? 0);
  const solvedFor = ({ rig: supposed = rig, periodS, decayTimeS }: Parameters<ModulationOutcome['gOf']>[0]): ModulationSolution => {
    const inertia = inertiaKgM2(supposed);
    const gamma = decayTimeS === undefined ? free.gamma.value : 1 / decayTimeS;
    const period = periodS ?? free.period.value;
    const omega0Squared =
      periodS === undefined && decayTimeS === undefined ? free.omega0Squared.value : ((2 * Math.PI) / period) ** 2 + gamma ** 2;
    const other = {
      geometry: geometryOf(supposed),
      oscillator: { inertiaKgM2: inertia, kappa: inertia * omega0Squared, gamma, periodS: period },
    };
    const ratio = amplitudeRad === 0 ? 1 : reread(scale, amplitudeRad, leverOf(supposed)) / amplitudeRad;
    const seen = observed.map((one) => ({ ...one, harmonics: one.harmonics.map((value) => value * ratio) }));
    return solveModulation(seen, other, solution.bigG);
  };
  const scatter = scatterOf(found, pendulum);
  const lateness = (changes: Parameters<typeof solvedFor>[0]) => solvedFor(changes).latenessS - solution.latenessS;
  const decayTimeS = free.decayTime?.value;
  const clockU =
    scatter === null
      ? null
      : Math.hypot(
          scatter.latenessU,
          lateness({ periodS: free.period.value + free.period.u, ...(decayTimeS === undefined ? {} : { decayTimeS }) }),
          decayTimeS === undefined ? 0 : lateness({ periodS: free.period.value, decayTimeS: decayTimeS + (free.decayTime?.u ?? 0) }),
        );
  return {
    solution: {
      bigG: solution.bigG,
      kappa: pendulum.oscillator.kappa,
      omega0Squared: free.omega0Squared.value,
      gamma: free.gamma.value,
    },
    statistical: scatter === null ? null : { value: solution.bigG, u: scatter.gU, nu: scatter.nu },
    clockOffset: clockU === null ? null : { value: offsetS + solution.latenessS, u: clockU },
    turns: records.reduce((sum, record, i) => sum + turnsThere(record, found.trust[i] ?? null), 0),
    amplitudeRad,
    gOf: (changes) => solvedFor(changes).bigG,
  };
}

/** Standard uncertainties of G and of the lateness from what the pieces of the record say one by one; null with fewer than two. */
function scatterOf(
  { records, fits, biases, trust, solution }: Locked,
  pendulum: RotatingPendulum,
): { gU: number; latenessU: number; nu: number } | null {
  const each = records.flatMap((record, i) => {
    const { speedRadS } = record.rotation;
    const model = harmonicsModel(pendulum, { ...solution, speedRadS });
    return harmonicsByPiece(record, fits[i] as RotationFit, trust[i] ?? null).map((harmonics) => {
      const corrected = harmonics.map((value, k) => value - (biases[i]?.[k] as number));
      return gaussStep([{ harmonics: corrected, speedRadS, turns: 1 }], [model]);
    });
  });
  const count = each.length;
  if (count < 2) return null;
  const u = (key: keyof ModulationSolution) => {
    const mean = meanOf(each.map((one) => one[key]));
    return Math.sqrt(each.reduce((sum, one) => sum + (one[key] - mean) ** 2, 0) / (count - 1) / count);
  };
  return { gU: u('bigG'), latenessU: u('latenessS'), nu: count - 1 };
}
