import { execFileSync } from 'node:child_process';
import { mkdirSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';

interface SoakResult {
  name: string;
  ok: boolean;
  [figure: string]: unknown;
}

const root = join(__dirname, '..', '..');

/** A run of the whole first or second size is kept; whatever is chosen otherwise is a look at a part. */
export const isWhole = (args: readonly string[]): boolean => args.every((arg) => arg === '--second');

/** Prints the result as JSON and, where the whole was run, keeps it with commit and date in `docs/soak/NAME.json`. A violation ends the process with 1. */
function report(result: SoakResult, isKept: boolean): void {
  const git = (...args: string[]) => execFileSync('git', args, { cwd: root, encoding: 'utf8' }).trim();
  const stamped = {
    ...result,
    ...(isKept ? {} : { partial: true }),
    commit: git('rev-parse', 'HEAD'),
    date: new Date().toISOString().slice(0, 10),
    tookS: Math.round(process.uptime()),
  };
  // Short lists of numbers stand on one line, as the formatter of the repository has them.
  const text = `${JSON.stringify(stamped, null, 2).replace(/\[[^[\]{}"]{1,100}\]/g, (list) => list.replace(/\s+/g, ' ').replace('[ ', '[').replace(' ]', ']'))}\n`;
  process.stdout.write(text);
  if (isKept) {
    mkdirSync(join(root, 'docs', 'soak'), { recursive: true });
    writeFileSync(join(root, 'docs', 'soak', `${result.name}.json`), text);
  }
  if (!result.ok) process.exitCode = 1;
}

/** One soak from its arguments to its report; whatever it throws ends the process with 2. */
export function soak(name: string, run: (args: readonly string[]) => Omit<SoakResult, 'name'> | Promise<Omit<SoakResult, 'name'>>): void {
  const args = process.argv.slice(2);
  const result = async () => run(args);
  result()
    .then((done) => report({ ...done, ok: done['ok'] === true, name }, isWhole(args)))
    .catch((error: unknown) => {
      process.stderr.write(`soak ${name}: ${error instanceof Error ? (error.stack ?? error.message) : String(error)}\n`);
      process.exitCode = 2;
    });
}
