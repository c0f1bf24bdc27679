import type { StepRow } from '../archive/run-records';
import type { MorningNight, MorningSheet } from '../contracts/morning';
import { differenceInU, qualityOf } from './earlier-nights';

/** Two runs side by side: what was measured, and what each step of their logs came to. */

type ComparedSheet = Pick<MorningSheet, 'tonight' | 'G' | 'drift' | 'room'>;

export interface ComparedValue {
  label: string;
  /** UCUM; empty for a number without a unit. */
  unit: string;
  one: { value: number; u: number | null } | null;
  other: { value: number; u: number | null } | null;
  /** Difference over its standard uncertainty, both taken as independent; null where one of the values or its u is missing. */
  inU: number | null;
}

type OfNight = (night: MorningNight) => ComparedValue['one'];

/** Both runs are of one rig: what its geometry makes uncertain in G is common to them, so G is compared by near minus far and period, not by its own u. */
export function compareMeasured(one: ComparedSheet, other: ComparedSheet): ComparedValue[] {
  const night = (pick: OfNight) => [one, other].map(({ tonight }) => (tonight === null ? null : pick(tonight)));
  const value = (label: string, unit: string, [a = null, b = null]: ComparedValue['one'][]): ComparedValue[] =>
    a === null && b === null ? [] : [{ label, unit, one: a, other: b, inU: a === null || b === null ? null : differenceInU(a, b) }];
  return [
    ...value(
      'near − far',
      'rad',
      night(({ reversal_rad }) => reversal_rad),
    ),
    ...value(
      'damped period',
      's',
      night(({ period_s }) => period_s),
    ),
    ...value(
      'decay time',
      's',
      night(({ decayTime_s }) => decayTime_s),
    ),
    ...value('quality factor Q', '', night(qualityOf)),
    ...value('drift of the zero at the start', 'rad/h', [one.drift?.start ?? null, other.drift?.start ?? null]),
    ...value('drift of the zero at the end', 'rad/h', [one.drift?.end ?? null, other.drift?.end ?? null]),
    // Its u is mostly that of lengths and masses which both runs share.
    ...value('G', 'm3.kg-1.s-2', [one.G, other.G]).map((compared) => ({ ...compared, inU: null })),
  ];
}

interface Span {
  least: number;
  greatest: number;
}

/** Least and greatest value of each channel of the surroundings within each run; null where a run has none of it. */
export function compareRooms(
  one: Pick<ComparedSheet, 'room'>,
  other: Pick<ComparedSheet, 'room'>,
): { name: string; unit: string; one: Span | null; other: Span | null }[] {
  const keyOf = ({ name, unit }: { name: string; unit: string }) => JSON.stringify([name, unit]);
  const span = ({ room }: Pick<ComparedSheet, 'room'>, key: string) => room.find((channel) => keyOf(channel) === key) ?? null;
  return [...new Set([...one.room, ...other.room].map(keyOf))].map((key) => {
    const [name, unit] = JSON.parse(key) as [string, string];
    return { name, unit, one: span(one, key), other: span(other, key) };
  });
}

type ComparedRow = Pick<StepRow, 'path' | 'startUtcMs' | 'endUtcMs' | 'angleEndDeg' | 'outcome' | 'good'> & { kind: string };

export interface ComparedStep<R extends ComparedRow = ComparedRow> {
  path: string;
  /** The row that counts: the last one of this path. Null: the run never came to it, or its protocol has no such step. */
  one: R | null;
  other: R | null;
  /** How often it was begun. */
  tries: { one: number; other: number };
  /** Begin since the first row of its run: other minus one, s; null where one of them is missing. */
  shiftS: number | null;
  /** Other minus one, s; null where one of them is missing or has not ended. */
  longerS: number | null;
  /** What differs, in words; empty: nothing. */
  differs: string[];
}

/** Steps are the same where each was begun as often, came to the same, stood or moved as long within 1 s, and ended at the same angle within 0.05 deg. */
const SAME_S = 1;
const SAME_DEG = 0.05;

/** The steps of both logs by their path, in the order of the first log, those of the second alone where they come. */
export function compareSteps<R extends ComparedRow>(one: readonly R[], other: readonly R[]): ComparedStep<R>[] {
  const [a, b] = [byPath(one), byPath(other)];
  return mergedPaths([...a.keys()], [...b.keys()]).map((path) => {
    const [first, second] = [a.get(path) ?? [], b.get(path) ?? []];
    const [left = null, right = null] = [first.at(-1), second.at(-1)];
    const begun = (rows: readonly R[], row: R) => row.startUtcMs - (rows[0]?.startUtcMs ?? row.startUtcMs);
    const shiftS = left === null || right === null ? null : (begun(other, right) - begun(one, left)) / 1000;
    const [lengthA, lengthB] = [lengthS(left), lengthS(right)];
    const longerS = lengthA === null || lengthB === null ? null : lengthB - lengthA;
    const tries = { one: first.length, other: second.length };
    return { path, one: left, other: right, tries, shiftS, longerS, differs: differences({ one: left, other: right, tries, longerS }) };
  });
}

const lengthS = (row: ComparedRow | null): number | null =>
  row === null || row.endUtcMs === null ? null : (row.endUtcMs - row.startUtcMs) / 1000;

function byPath<R extends ComparedRow>(rows: readonly R[]): Map<string, R[]> {
  const found = new Map<string, R[]>();
  for (const row of rows) found.set(row.path, [...(found.get(row.path) ?? []), row]);
  return found;
}

/** Each path once: those of the second list that the first lacks come after the one they follow. */
function mergedPaths(one: readonly string[], other: readonly string[]): string[] {
  const known = new Set(one);
  const after = new Map<string | null, string[]>();
  let last: string | null = null;
  for (const path of other) {
    if (known.has(path)) last = path;
    else after.set(last, [...(after.get(last) ?? []), path]);
  }
  return [...(after.get(null) ?? []), ...one.flatMap((path) => [path, ...(after.get(path) ?? [])])];
}

function differences({ one, other, tries, longerS }: Pick<ComparedStep, 'one' | 'other' | 'tries' | 'longerS'>): string[] {
  if (one === null) return ['only in the second'];
  if (other === null) return ['only in the first'];
  const said: string[] = [];
  if (one.kind !== other.kind) said.push(`${one.kind}, then ${other.kind}`);
  if (one.outcome !== other.outcome) said.push(`${one.outcome ?? 'under way'}, then ${other.outcome ?? 'under way'}`);
  if (one.good !== other.good) said.push(one.good === false ? 'good only in the second' : 'good only in the first');
  if (tries.one !== tries.other) said.push(`begun ${tries.one} and ${tries.other} times`);
  if (longerS !== null && Math.abs(longerS) >= SAME_S) said.push(longerS > 0 ? 'longer' : 'shorter');
  const turnedDeg = one.angleEndDeg === null || other.angleEndDeg === null ? 0 : other.angleEndDeg - one.angleEndDeg;
  if (Math.abs(turnedDeg) > SAME_DEG) said.push('ended at another angle');
  return said;
}
