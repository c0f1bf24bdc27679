import { boxAverage, type BoxAverages } from '../statistics/box-average';
import { leastSquares } from '../statistics/least-squares';
import { toRad, type ChannelScale } from './channel-scale';
import type { DwellSamples } from './dwell-samples';
import type { RotationWindow } from './rotation-windows';

/** The lock-in: harmonics of twice the turntable's angle in a record of whole turns, fitted beside drift and the ringing of the start. */

/** Harmonics 2, 4, … 12 of a turn are fitted. */
export const fittedHarmonics = 6;
/** Data are averaged to this many boxes in the shorter of a period and a half turn. */
const boxesPerCycle = 60;
/** The record is cut into pieces of whole turns, each with an offset and a slope of its own; at most so many. */
const mostPieces = 24;

/** One rotation's data, averaged, and the columns they are fitted with. */
export interface RotationRecord {
  rotation: RotationWindow;
  averages: BoxAverages;
  pieces: number;
  /** Which piece each datum belongs to. */
  pieceOf: Int32Array;
  /** cos 2φ, sin 2φ, cos 4φ, …: averaged over the boxes like the data. */
  harmonics: Float64Array[];
  /** Cosine and sine of the free ringing. */
  ringing: [Float64Array, Float64Array];
  /** The same for data that are taken at the middle of the boxes. */
  atMiddle: Pick<RotationRecord, 'harmonics' | 'ringing'>;
}

export interface RotationFit {
  /** a₁, b₁, a₂, … of cos 2kφ and sin 2kφ, rad. */
  harmonics: Float64Array;
  ringing: [number, number];
  /** Mean of the pieces' offsets, rad. */
  offsetRad: number;
  /** Of the averaged data, rad. */
  residuals: Float64Array;
}

/** ω (rad/s) and γ (1/s) of the free pendulum. */
export interface FreeRinging {
  omega: number;
  gamma: number;
}

export function recordOf(
  samples: DwellSamples,
  rotation: RotationWindow,
  { scale, free }: { scale: ChannelScale; free: FreeRinging },
): RotationRecord {
  const { tS, reading, window } = samples;
  const halfTurnS = Math.PI / Math.abs(rotation.speedRadS);
  const widthS = Math.min((2 * Math.PI) / free.omega, halfTurnS) / boxesPerCycle;
  const averaged = (value: (k: number) => number) =>
    boxAverage(
      tS,
      tS.map((_, k) => value(k)),
      widthS,
    );
  const averages = averaged((k) => toRad(scale, reading[k] as number));
  const phi = tS.map((t) => rotation.phiRad(window.fromUtcMs + 1000 * t));
  const phiMiddle = averages.t.map((t) => rotation.phiRad(window.fromUtcMs + 1000 * t));
  const pieces = Math.min(mostPieces, rotation.turns);
  const lengthS = (window.toUtcMs - window.fromUtcMs) / 1000;
  const dying = (t: number, f: (x: number) => number) => Math.exp(-free.gamma * t) * f(free.omega * t);
  return {
    rotation,
    averages,
    pieces,
    pieceOf: Int32Array.from(averages.t, (t) => Math.min(pieces - 1, Math.max(0, Math.floor((t / lengthS) * pieces)))),
    harmonics: harmonicColumns((f, k) => averaged((i) => f(2 * k * (phi[i] as number))).y),
    ringing: [averaged((i) => dying(tS[i] as number, Math.cos)).y, averaged((i) => dying(tS[i] as number, Math.sin)).y],
    atMiddle: {
      harmonics: harmonicColumns((f, k) => phiMiddle.map((one) => f(2 * k * one))),
      ringing: [averages.t.map((t) => dying(t, Math.cos)), averages.t.map((t) => dying(t, Math.sin))],
    },
  };
}

const harmonicColumns = (column: (f: (x: number) => number, k: number) => Float64Array) =>
  Array.from({ length: fittedHarmonics }, (_, i) => [column(Math.cos, i + 1), column(Math.sin, i + 1)]).flat();

export interface FitChoice {
  y: Float64Array;
  columns: Pick<RotationRecord, 'harmonics' | 'ringing'>;
  /** Share with which each datum counts. */
  trust: Float64Array | null;
}

/** @throws SingularMatrixError where too little of the record is there */
export function fitRotation(record: RotationRecord, { y, columns, trust }: FitChoice): RotationFit {
  const { averages, pieces } = record;
  const root = averages.weight.map((weight, i) => Math.sqrt(weight * (trust?.[i] ?? 1)));
  const weighed = (column: Float64Array) => column.map((value, i) => value * (root[i] as number));
  const drift = Array.from({ length: pieces }, (_, piece) => driftColumns(record, piece)).flat();
  const all = [...columns.harmonics, ...columns.ringing, ...drift].map(weighed);
  const { coefficients, residuals } = leastSquares(all, weighed(y));
  const after = 2 * fittedHarmonics;
  const offsets = Array.from({ length: pieces }, (_, piece) => coefficients[after + 2 + 2 * piece] as number);
  return {
    harmonics: coefficients.slice(0, after),
    ringing: [coefficients[after] as number, coefficients[after + 1] as number],
    offsetRad: offsets.reduce((sum, one) => sum + one, 0) / pieces,
    residuals: residuals.map((value, i) => (root[i] === 0 ? 0 : value / (root[i] as number))),
  };
}

/** Offset and slope of one piece, from −1 to 1. */
function driftColumns({ averages, pieces, pieceOf, rotation: { window } }: RotationRecord, piece: number): [Float64Array, Float64Array] {
  const pieceS = (window.toUtcMs - window.fromUtcMs) / 1000 / pieces;
  const own = pieceOf.map((one) => (one === piece ? 1 : 0));
  return [Float64Array.from(own), averages.t.map((t, i) => (own[i] as number) * (2 * (t / pieceS - piece) - 1))];
}

/** The harmonics of each piece by itself, the ringing taken as the whole record tells it. */
export function harmonicsByPiece(record: RotationRecord, fit: RotationFit, trust: Float64Array | null): Float64Array[] {
  const { averages, pieces, pieceOf, harmonics, ringing } = record;
  const rest = averages.y.map((y, i) => y - fit.ringing[0] * (ringing[0][i] as number) - fit.ringing[1] * (ringing[1][i] as number));
  return Array.from({ length: pieces }, (_, piece) => {
    const own = [...pieceOf.keys()].filter((i) => pieceOf[i] === piece);
    const root = own.map((i) => Math.sqrt((averages.weight[i] as number) * (trust?.[i] ?? 1)));
    const picked = (column: Float64Array) => own.map((i, n) => (column[i] as number) * (root[n] as number));
    const columns = [...harmonics, ...driftColumns(record, piece)].map(picked);
    return leastSquares(columns, picked(rest)).coefficients.slice(0, 2 * fittedHarmonics);
  });
}
