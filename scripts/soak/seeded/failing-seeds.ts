import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';

/** Seeds that ever failed: of each soak, of each kind of its cases. */
export type FailingSeeds = Readonly<Record<string, Readonly<Record<string, readonly number[]>>>>;

/** One case of a soak. */
export interface SeededCase {
  soak: string;
  kind: string;
  seed: number;
}

const keptFile = join(__dirname, '..', '..', '..', 'tests', 'fixtures', 'failing-seeds.json');

/** Every seed that is kept, in the order of the file. */
export function failingSeeds(file = keptFile): SeededCase[] {
  const kept = JSON.parse(readFileSync(file, 'utf8')) as FailingSeeds;
  return Object.entries(kept).flatMap(([soak, kinds]) =>
    Object.entries(kinds).flatMap(([kind, seeds]) => seeds.map((seed) => ({ soak, kind, seed }))),
  );
}

/** Keeps a seed that failed, for ever and once. */
export function keepFailingSeed({ soak, kind, seed }: SeededCase, file = keptFile): void {
  const kept = JSON.parse(readFileSync(file, 'utf8')) as FailingSeeds;
  const seeds = [...new Set([...(kept[soak]?.[kind] ?? []), seed])].sort((a, b) => a - b);
  writeFileSync(file, linesOf({ ...kept, [soak]: { ...kept[soak], [kind]: seeds } }));
}

/** A line for each kind, so that two people's seeds meet in no line. */
function linesOf(kept: FailingSeeds): string {
  const kindsOf = (kinds: FailingSeeds[string]) =>
    Object.entries(kinds).map(([kind, seeds]) => `    ${JSON.stringify(kind)}: ${JSON.stringify(seeds)}`);
  const soaks = Object.entries(kept).map(([soak, kinds]) => `  ${JSON.stringify(soak)}: {\n${kindsOf(kinds).join(',\n')}\n  }`);
  return `{\n${soaks.join(',\n')}\n}\n`;
}
