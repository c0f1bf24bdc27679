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
/** A piece of which less is there tells too little of its own drift and harmonics, and is left out. */
const leastShare = 0.5;
/** The time of a piece is looked at in so many parts of a turn: two to a cycle of the highest harmonic. */
const partsPerTurn = 4 * fittedHarmonics;

interface Piece {
  fromS: number;
  toS: number;
  turns: number;
}

/** One rotation's data, averaged, and the columns they are fitted with. */
export interface RotationRecord {
  rotation: RotationWindow;
  averages: BoxAverages;
  /** Of whole turns, one after the other. */
  pieces: Piece[];
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
  /** Mean of the offsets of the pieces that are there, rad. */
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
  const lengthS = (window.toUtcMs - window.fromUtcMs) / 1000;
  const turnsEach = Math.ceil(rotation.turns / mostPieces);
  const pieceS = (turnsEach * lengthS) / rotation.turns;
  const pieces = Array.from({ length: Math.ceil(rotation.turns / turnsEach) }, (_, i): Piece => {
    const [fromS, toS] = [i * pieceS, Math.min(lengthS, (i + 1) * pieceS)];
    return { fromS, toS, turns: Math.min(turnsEach, rotation.turns - i * turnsEach) };
  });
  const dying = (t: number, f: (x: number) => number) => Math.exp(-free.gamma * t) * f(free.omega * t);
  return {
    rotation,
    averages,
    pieces,
    pieceOf: Int32Array.from(averages.t, (t) => Math.min(pieces.length - 1, Math.max(0, Math.floor(t / pieceS)))),
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

/** Places of the pieces of which enough is there, by time and so far as it is trusted. */
function piecesThere({ averages, pieces, pieceOf }: RotationRecord, trust: Float64Array | null): number[] {
  const seen = pieces.map(({ turns }) => new Uint8Array(partsPerTurn * turns));
  averages.t.forEach((t, i) => {
    const { fromS, toS } = pieces[pieceOf[i] as number] as Piece;
    const parts = seen[pieceOf[i] as number] as Uint8Array;
    const part = Math.floor(((t - fromS) / (toS - fromS)) * parts.length);
    if ((trust?.[i] ?? 1) >= leastShare) parts[Math.min(parts.length - 1, Math.max(0, part))] = 1;
  });
  return [...pieces.keys()].filter((piece) => {
    const parts = seen[piece] as Uint8Array;
    return parts.filter(Boolean).length >= leastShare * parts.length;
  });
}

/** Whole turns in the pieces that are there. */
export const turnsThere = (record: RotationRecord, trust: Float64Array | null): number =>
  piecesThere(record, trust).reduce((sum, piece) => sum + (record.pieces[piece] as Piece).turns, 0);

/** @throws SingularMatrixError where too little of the record is there */
export function fitRotation(record: RotationRecord, { y, columns, trust }: FitChoice): RotationFit {
  const { averages, pieceOf } = record;
  const there = piecesThere(record, trust);
  const root = averages.weight.map((weight, i) => (there.includes(pieceOf[i] as number) ? Math.sqrt(weight * (trust?.[i] ?? 1)) : 0));
  const weighed = (column: Float64Array) => column.map((value, i) => value * (root[i] as number));
  const drift = there.flatMap((piece) => driftColumns(record, piece));
  const all = [...columns.harmonics, ...columns.ringing, ...drift].map(weighed);
  const { coefficients, residuals } = leastSquares(all, weighed(y));
  const after = 2 * fittedHarmonics;
  const offsets = there.map((_, i) => coefficients[after + 2 + 2 * i] as number);
  return {
    harmonics: coefficients.slice(0, after),
    ringing: [coefficients[after] as number, coefficients[after + 1] as number],
    offsetRad: offsets.reduce((sum, one) => sum + one, 0) / offsets.length,
    residuals: residuals.map((value, i) => (root[i] === 0 ? 0 : value / (root[i] as number))),
  };
}

/** Offset and slope of one piece, from −1 to 1. */
function driftColumns({ averages, pieces, pieceOf }: RotationRecord, piece: number): [Float64Array, Float64Array] {
  const { fromS, toS } = pieces[piece] as Piece;
  const own = pieceOf.map((one) => (one === piece ? 1 : 0));
  return [Float64Array.from(own), averages.t.map((t, i) => (own[i] as number) * ((2 * (t - fromS)) / (toS - fromS) - 1))];
}

/** The harmonics of each piece that is there by itself, the ringing taken as the whole record tells it. */
export function harmonicsByPiece(record: RotationRecord, fit: RotationFit, trust: Float64Array | null): Float64Array[] {
  const { averages, pieceOf, harmonics, ringing } = record;
  const rest = averages.y.map((y, i) => y - fit.ringing[0] * (ringing[0][i] as number) - fit.ringing[1] * (ringing[1][i] as number));
  return piecesThere(record, trust).map((piece) => {
    const own = [...pieceOf.keys()].filter((i) => pieceOf[i] === piece);
    const root = own.map((i) => Math.sqrt((averages.weight[i] as number) * (trust?.[i] ?? 1)));
    const picked = (column: Float64Array) => own.map((i, n) => (column[i] as number) * (root[n] as number));
    const columns = [...harmonics, ...driftColumns(record, piece)].map(picked);
    return leastSquares(columns, picked(rest)).coefficients.slice(0, 2 * fittedHarmonics);
  });
}
