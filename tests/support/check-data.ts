import { existsSync, readFileSync } from 'node:fs';
import { resolve } from 'node:path';

const folder = resolve(__dirname, '../../../shared/data');

/** Path of a file of the check data beside the project, or null (with the reason printed once) where there is none. */
export function checkDataPath(name: string): string | null {
  const path = resolve(folder, name);
  if (existsSync(path)) return path;
  process.stdout.write(`not run: the check data file ${name} is not beside the project (expected at ../shared/data/)\n`);
  return null;
}

export type CheckValues = Record<string, Record<string, unknown>>;

/** The table of independently computed check values, or null where it is absent. */
export function checkValues(): CheckValues | null {
  const path = checkDataPath('check-values.json');
  return path === null ? null : (JSON.parse(readFileSync(path, 'utf8').replaceAll('NaN', 'null')) as CheckValues);
}

/** Smallest number of leading digits in which two numbers agree, as |a − b| ≤ tolerance · |b|. */
export function relativeDifference(actual: number, expected: number): number {
  return expected === 0 ? Math.abs(actual) : Math.abs(actual / expected - 1);
}
