import type { ProtocolDocument, RepeatStep, Step } from './document';
import { documentFields, stepFields } from './document';

/** One difference between two protocols. */
export interface Difference {
  kind: 'added' | 'removed' | 'changed';
  /** Path of the step in the first document, null where it is not in it; both null for a field of the document itself. */
  pathBefore: string | null;
  /** Path of the step in the second document. */
  pathAfter: string | null;
  /** The field that changed; empty where a whole step was added or removed. */
  field: string;
  /** Value or step before and after; undefined where there was none. */
  before: unknown;
  after: unknown;
}

/** Comparing two lists step by step costs their product; beyond this they are compared place by place. */
const greatestProduct = 4_000_000;

/**
 * What was changed from one document to another, in reading order: fields of the document first, then steps. Steps that are alike are
 * matched wherever they moved within their list; of those left between, steps of the same kind count as changed, the others as
 * removed and added.
 */
export function compareDocuments(before: ProtocolDocument, after: ProtocolDocument): Difference[] {
  const fields = documentFields.filter((field) => field !== 'steps');
  return [
    ...fieldDifferences(before, after, { fields, paths: { before: null, after: null } }),
    ...listDifferences(before.steps, after.steps, { before: '', after: '' }),
  ];
}

interface Paths {
  before: string | null;
  after: string | null;
}

function fieldDifferences(before: object, after: object, { fields, paths }: { fields: readonly string[]; paths: Paths }): Difference[] {
  const valueOf = (from: object, field: string): unknown => (from as Record<string, unknown>)[field];
  return fields
    .filter((field) => !same(valueOf(before, field), valueOf(after, field)))
    .map((field) => {
      const values = { before: valueOf(before, field), after: valueOf(after, field) };
      const kind = values.before === undefined ? 'added' : values.after === undefined ? 'removed' : 'changed';
      return { kind, pathBefore: paths.before, pathAfter: paths.after, field, ...values };
    });
}

/** Equal as JSON, whatever the order of the fields; a field that is undefined counts as absent. */
function same(a: unknown, b: unknown): boolean {
  if (Object.is(a, b)) return true;
  if (typeof a !== 'object' || typeof b !== 'object' || a === null || b === null || Array.isArray(a) !== Array.isArray(b)) return false;
  const [left, right] = [a as Record<string, unknown>, b as Record<string, unknown>];
  return [...new Set([...Object.keys(left), ...Object.keys(right)])].every((key) => same(left[key], right[key]));
}

interface Row {
  step: Step;
  path: string;
}

const rowsOf = (steps: readonly Step[], prefix: string): Row[] =>
  steps.map((step, index) => ({ step, path: `${prefix}${index + 1}.${step.kind}` }));

function listDifferences(before: readonly Step[], after: readonly Step[], prefix: { before: string; after: string }): Difference[] {
  const left = rowsOf(before, prefix.before);
  const right = rowsOf(after, prefix.after);
  const differences: Difference[] = [];
  let [leftAt, rightAt] = [0, 0];
  for (const [i, j] of [...commonPairs(before, after), [before.length, after.length] as const]) {
    differences.push(...between(left.slice(leftAt, i), right.slice(rightAt, j)));
    [leftAt, rightAt] = [i + 1, j + 1];
  }
  return differences;
}

/** Places (from 0) of the steps that a longest common subsequence of both lists matches. */
function commonPairs(before: readonly Step[], after: readonly Step[]): (readonly [number, number])[] {
  let start = 0;
  while (start < before.length && start < after.length && same(before[start], after[start])) start += 1;
  let end = 0;
  while (end < before.length - start && end < after.length - start && same(before[before.length - 1 - end], after[after.length - 1 - end]))
    end += 1;
  const head = Array.from({ length: start }, (_, index) => [index, index] as const);
  const tail = Array.from({ length: end }, (_, index) => [before.length - end + index, after.length - end + index] as const);
  const middle = matched(before.slice(start, before.length - end), after.slice(start, after.length - end));
  return [...head, ...middle.map(([i, j]) => [i + start, j + start] as const), ...tail];
}

function matched(before: readonly Step[], after: readonly Step[]): (readonly [number, number])[] {
  if (before.length * after.length > greatestProduct) return [];
  const lengths = Array.from({ length: before.length + 1 }, () => new Uint32Array(after.length + 1));
  const at = (i: number, j: number) => lengths[i]?.[j] ?? 0;
  const alike = before.map((step) => after.map((other) => same(step, other)));
  for (let i = before.length - 1; i >= 0; i -= 1) {
    for (let j = after.length - 1; j >= 0; j -= 1) {
      (lengths[i] as Uint32Array)[j] = alike[i]?.[j] === true ? at(i + 1, j + 1) + 1 : Math.max(at(i + 1, j), at(i, j + 1));
    }
  }
  const pairs: (readonly [number, number])[] = [];
  for (let i = 0, j = 0; i < before.length && j < after.length;) {
    if (alike[i]?.[j] === true) pairs.push([i++, j++] as const);
    else if (at(i + 1, j) >= at(i, j + 1)) i += 1;
    else j += 1;
  }
  return pairs;
}

/** Differences between two stretches that have no step in common: same kinds are paired in order. */
function between(left: readonly Row[], right: readonly Row[]): Difference[] {
  const differences: Difference[] = [];
  let next = 0;
  for (const row of left) {
    const partner = right.findIndex((other, index) => index >= next && other.step.kind === row.step.kind);
    if (partner === -1) {
      differences.push({ kind: 'removed', pathBefore: row.path, pathAfter: null, field: '', before: row.step, after: undefined });
      continue;
    }
    differences.push(...right.slice(next, partner).map(added), ...stepDifferences(row, right[partner] as Row));
    next = partner + 1;
  }
  return [...differences, ...right.slice(next).map(added)];
}

const added = (row: Row): Difference => ({
  kind: 'added',
  pathBefore: null,
  pathAfter: row.path,
  field: '',
  before: undefined,
  after: row.step,
});

function stepDifferences(left: Row, right: Row): Difference[] {
  const fields = stepFields[left.step.kind].filter((field) => field !== 'steps');
  const own = fieldDifferences(left.step, right.step, { fields, paths: { before: left.path, after: right.path } });
  if (left.step.kind !== 'repeat') return own;
  return [
    ...own,
    ...listDifferences(left.step.steps, (right.step as RepeatStep).steps, { before: `${left.path}.`, after: `${right.path}.` }),
  ];
}
