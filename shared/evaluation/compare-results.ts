import { UNIT_OF_G } from '../lib/format-number';
import type { RigDocument } from '../rig/document';
import { unitOfInput } from './input-words';
import type { EvaluationResult } from './result';

/** A value with its standard uncertainty (k = 1), where the result has one for it; or another value of the result, null for nothing. */
export type ComparedValue = { value: number; u: number | null } | string | boolean | null;

export interface ResultDifference {
  /** Place in the result, lines of a list by their name: `G`, `budget[rod.mass_kg].share`. */
  path: string;
  /** Unit of values and change; empty for numbers without one. */
  unit: string;
  before: ComparedValue;
  after: ComparedValue;
  /** After minus before, where both are numbers. */
  change: number | null;
}

/** What a result says at each of its places, and the units that it names itself or that the rig gives to the lines of the budget. */
interface Leaves {
  values: Map<string, ComparedValue>;
  units: Map<string, string>;
}

/**
 * Every place in which two results of the evaluation differ, G first; empty where they are the same to the last bit. Numbers are
 * compared exactly, for the same program makes the same numbers of the same data. `rig` is the one that was evaluated.
 */
export function compareResults(before: EvaluationResult, after: EvaluationResult, rig: RigDocument): ResultDifference[] {
  const { values: was, units: unitsWere } = leavesOf(before, rig);
  const { values: is, units } = leavesOf(after, rig);
  const differences: ResultDifference[] = [];
  for (const path of new Set([...was.keys(), ...is.keys()])) {
    const [one, other] = [was.get(path) ?? null, is.get(path) ?? null];
    if (isSame(one, other)) continue;
    const change = isMeasured(one) && isMeasured(other) ? other.value - one.value : null;
    differences.push({ path, unit: units.get(path) ?? unitsWere.get(path) ?? unitOfPath(path), before: one, after: other, change });
  }
  return differences.sort((a, b) => Number(b.path === 'G') - Number(a.path === 'G'));
}

export const isMeasured = (value: ComparedValue): value is { value: number; u: number | null } =>
  typeof value === 'object' && value !== null;

const isSame = (a: ComparedValue, b: ComparedValue): boolean =>
  isMeasured(a) && isMeasured(b) ? a.value === b.value && a.u === b.u : a === b;

function leavesOf(result: EvaluationResult, rig: RigDocument): Leaves {
  const leaves: Leaves = { values: new Map(), units: new Map() };
  collect(leaves, '', result);
  for (const { input } of result.budget ?? []) {
    const [path, unit] = [`budget[${input}]`, unitOfInput(input, rig)];
    leaves.units.set(path, unit).set(`${path}.sensitivity`, unit === '' ? UNIT_OF_G : `${UNIT_OF_G} per ${unit}`);
  }
  return leaves;
}

function collect(leaves: Leaves, path: string, node: unknown): void {
  if (Array.isArray(node)) node.forEach((item: unknown, index) => collect(leaves, `${path}[${nameOf(item) ?? index}]`, item));
  else if (typeof node === 'number') leaves.values.set(path, { value: node, u: null });
  else if (typeof node === 'string' || typeof node === 'boolean' || node === null) leaves.values.set(path, node);
  else if (typeof node === 'object') collectObject(leaves, path, node as Record<string, unknown>);
}

/** A value and its u are one leaf, however many other facts stand beside them. */
function collectObject(leaves: Leaves, path: string, { value, u, ...others }: Record<string, unknown>): void {
  const rest: Record<string, unknown> = others;
  if (typeof value === 'number') {
    leaves.values.set(path, { value, u: typeof u === 'number' ? u : null });
    if (typeof rest['unit'] === 'string') leaves.units.set(path, rest['unit']);
  } else Object.assign(rest, value === undefined ? {} : { value }, u === undefined ? {} : { u });
  for (const [key, child] of Object.entries(rest)) collect(leaves, path === '' ? key : `${path}.${key}`, child);
}

/** What tells a line of a list from its neighbours, so that one line more does not make all that follow differ. */
function nameOf(item: unknown): string | null {
  if (typeof item !== 'object' || item === null) return null;
  for (const key of ['seq', 'input', 'channel', 'method', 'drift', 'code', 'tau_s'] as const)
    if (key in item) return String((item as Record<string, unknown>)[key]);
  return null;
}

const placesOfG =
  /^(G|codata|regressions\[.*\]\.(with|without)\.G|methods\[.*\]\.(G|difference))$|^monteCarlo\.(G_mean|G_u|interval95(_u)?\[\d\])$|\.contribution$/;

function unitOfPath(path: string): string {
  if (placesOfG.test(path)) return UNIT_OF_G;
  if (path.endsWith('_N_m')) return 'N m/rad';
  if (path.endsWith('_rad') || path === 'pretend') return 'rad';
  return path.endsWith('_s') ? 's' : '';
}
