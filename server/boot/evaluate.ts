import { parseArgs } from 'node:util';
import { readArchive } from '@/shared/archive/read-archive';
import { UnusableArchive } from '@/shared/archive/unusable-archive';
import { evaluateArchive } from '@/shared/evaluation/evaluate-archive';
import { clockChoiceSchema, type ClockChoice } from '@/shared/evaluation/clock-choice';
import { evaluationMethods, type EvaluationMethod, type EvaluationOptions } from '@/shared/evaluation/registration';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { readArchiveFiles } from '../evaluation/archive-files';
import { sha256Hex } from '../evaluation/sha256';
import { createTrialCrew } from './parallel-trials';

/** `npm run -s evaluate -- PATH …`: G and its uncertainty from an archive, without server, database or network. */

const usage =
  'Usage: npm run -s evaluate -- PATH [--method equilibrium|period|acceleration|modulation] [--channel NAME] [--bound RAD] [--trials N] [--clock left|SECONDS]';

const options = {
  method: { type: 'string' },
  channel: { type: 'string' },
  bound: { type: 'string' },
  trials: { type: 'string' },
  clock: { type: 'string' },
} as const;

class UnusableArguments extends Error {}

/** Monte Carlo trials where the command line does not say how many. */
const usualTrials = 100_000;

interface Request {
  path: string;
  trials: number;
  options: EvaluationOptions;
}

function requested(args: readonly string[]): Request {
  const { values, positionals } = parsedArguments(args);
  const [path, ...more] = positionals;
  if (path === undefined || more.length > 0) throw new UnusableArguments(`name one archive, a folder or a ZIP.\n${usage}`);
  if (values.trials !== undefined && !/^\d{1,8}$/.test(values.trials))
    throw new UnusableArguments(`--trials ${values.trials}: a whole number from 0 to 99 999 999 is needed`);
  const boundRad = values.bound === undefined ? undefined : Number(values.bound);
  if (boundRad !== undefined && !(boundRad > 0 && Number.isFinite(boundRad)))
    throw new UnusableArguments(`--bound ${values.bound}: a positive angle in rad is needed`);
  return {
    path,
    trials: values.trials === undefined ? usualTrials : Number(values.trials),
    options: {
      ...(values.method === undefined ? {} : { method: methodOf(values.method) }),
      ...(values.channel === undefined ? {} : { channel: values.channel }),
      ...(boundRad === undefined ? {} : { boundRad }),
      ...(values.clock === undefined ? {} : { clock: clockOf(values.clock) }),
    },
  };
}

function parsedArguments(args: readonly string[]) {
  try {
    return parseArgs({ args: [...args], options, allowPositionals: true });
  } catch (error) {
    throw new UnusableArguments(`${error instanceof Error ? error.message : String(error)}\n${usage}`);
  }
}

function clockOf(text: string): ClockChoice {
  if (text === 'left') return { kind: 'left' };
  const choice = clockChoiceSchema.safeParse({ kind: 'set', offset_s: text.trim() === '' ? NaN : Number(text) });
  if (!choice.success)
    throw new UnusableArguments(
      `--clock ${text}: "left", or by how many seconds the channel's clock is ahead of the step log's, is needed`,
    );
  return choice.data;
}

function methodOf(name: string): EvaluationMethod {
  const method = evaluationMethods.find((one) => one === name);
  if (method === undefined) throw new UnusableArguments(`--method ${name}: there are ${evaluationMethods.join(', ')}`);
  return method;
}

/** Evaluates the archive at a path, with Monte Carlo trials. @throws UnusableArchive */
async function evaluatePath(path: string, chosen: EvaluationOptions = {}, trials = usualTrials): Promise<EvaluationResult> {
  const crew = createTrialCrew(trials);
  try {
    const { result, trialModel } = evaluateArchive(readArchive(readArchiveFiles(path), sha256Hex), chosen);
    return { ...result, monteCarlo: trialModel === null ? null : await crew.run(trialModel) };
  } finally {
    await crew.close();
  }
}

export interface Output {
  out: (text: string) => void;
  err: (text: string) => void;
}

const toProcess: Output = { out: (text) => process.stdout.write(text), err: (text) => process.stderr.write(text) };

/** The command: one JSON object on `out` and 0, or a message on `err` and 2. `args` are those after the command's name. */
export async function main(args: readonly string[], output: Output = toProcess): Promise<number> {
  try {
    const { path, options: chosen, trials } = requested(args);
    output.out(`${JSON.stringify(await evaluatePath(path, chosen, trials), null, 2)}\n`);
    return 0;
  } catch (error) {
    if (error instanceof UnusableArchive || error instanceof UnusableArguments) output.err(`evaluate: ${error.message}\n`);
    else throw error;
    return 2;
  }
}

if (require.main === module) void main(process.argv.slice(2)).then((code) => (process.exitCode = code));
