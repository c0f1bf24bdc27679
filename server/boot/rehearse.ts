import { existsSync, mkdirSync, readdirSync, statSync } from 'node:fs';
import { performance } from 'node:perf_hooks';
import { parseArgs } from 'node:util';
import packageJson from '@/package.json';
import { buildArchive } from '@/shared/archive/build-archive';
import { canonicalJson } from '@/shared/archive/chain';
import type { RunStart, SimulatedRun } from '@/shared/archive/run-records';
import { CODATA_2022_G } from '@/shared/physics/constants';
import { oscillatorOf } from '@/shared/physics/oscillator';
import { geometryOf } from '@/shared/physics/torque';
import { excursionOf } from '@/shared/planning/excursion';
import { checkProtocol } from '@/shared/protocol/check';
import type { Finding } from '@/shared/protocol/finding';
import { isShuffled } from '@/shared/protocol/shuffle';
import { planTimeline } from '@/shared/protocol/timeline';
import type { RigDocument } from '@/shared/rig/document';
import { faultKinds, isFaultKind } from '../engine/rehearsal/rehearsal-faults';
import { type Rehearsal, rehearse } from '../engine/rehearsal/rehearse';
import { BeyondFirmware } from '../links/board/commission';
import { writeArchiveFolder } from '../evaluation/archive-files';
import { sha256Hex } from '../evaluation/sha256';
import { type Choice, chosenProtocol, listed, Unusable } from './chosen-protocol';
import { rehearsalParts } from './rehearsal-parts';

/** `npm run -s rehearse -- …`: runs a protocol on the simulated rig in fast time and writes the archive of the run. */

const usage =
  'Usage: npm run -s rehearse -- (PROTOCOL.json | --template NAME) --out DIR [--rig RIG.json] [--seed N] [--true-g X] [--rate HZ] [--start ISO] [--draw-geometry] [--board] [--fault KIND@SECONDS]…';

const options = {
  template: { type: 'string' },
  rig: { type: 'string' },
  out: { type: 'string' },
  seed: { type: 'string', default: '1' },
  'true-g': { type: 'string', default: String(CODATA_2022_G.value) },
  rate: { type: 'string', default: '10' },
  start: { type: 'string', default: '2000-01-01T00:00:00Z' },
  fault: { type: 'string', multiple: true, default: [] as string[] },
  'draw-geometry': { type: 'boolean', default: false },
  board: { type: 'boolean', default: false },
} as const;

const GREATEST_SEED = 4_294_967_295;
const GREATEST_RATE_HZ = 1000;
/** Five days at 10 Hz: what fits into memory as the text of one file. */
const MOST_SAMPLES = 5_000_000;

interface Request extends Choice {
  folder: string;
  startUtcMs: number;
  simulated: SimulatedRun;
  /** On the emulated controller board instead of the light simulated controller. */
  board: boolean;
}

function requested(args: readonly string[]): Request {
  const { values, positionals } = parsedArguments(args);
  const { document, rig } = chosenProtocol({ positionals, template: values.template, rig: values.rig, usage });
  const startUtcMs = instant(values.start);
  const simulated = {
    trueG: trueG(values['true-g']),
    seed: wholeNumber('--seed', values.seed),
    rateHz: sampleRate(values.rate),
    faults: values.fault.map(faultOf),
    ...(values['draw-geometry'] ? { drawGeometry: true as const } : {}),
  };
  return { document, rig, startUtcMs, simulated, board: values.board, folder: emptyFolder(values.out) };
}

function parsedArguments(args: readonly string[]) {
  try {
    return parseArgs({ args: [...args], options, allowPositionals: true });
  } catch (error) {
    throw new Unusable(`${error instanceof Error ? error.message : String(error)}\n${usage}`);
  }
}

const plainNumber = (text: string) => (text.trim() === '' ? Number.NaN : Number(text));

/** 0 makes a rehearsal without gravity: all that is left is what else moves the pendulum. */
function trueG(text: string): number {
  const value = plainNumber(text);
  if (Number.isFinite(value) && value >= 0) return value;
  throw new Unusable(`--true-g ${text}: a number from 0 is needed, in m3 kg-1 s-2.`);
}

function sampleRate(text: string): number {
  const value = plainNumber(text);
  if (value > 0 && value <= GREATEST_RATE_HZ) return value;
  throw new Unusable(`--rate ${text}: a number above 0 and at most ${GREATEST_RATE_HZ} is needed, in Hz.`);
}

function wholeNumber(name: string, text: string): number {
  const value = Number(text);
  if (/^\d+$/.test(text) && value <= GREATEST_SEED) return value;
  throw new Unusable(`${name} ${text}: a whole number from 0 to ${GREATEST_SEED} is needed.`);
}

function instant(text: string): number {
  const utcMs = /^\d{4}-\d{2}-\d{2}T\d{2}:\d{2}(:\d{2}(\.\d+)?)?(Z|[+-]\d{2}:\d{2})$/.test(text) ? Date.parse(text) : Number.NaN;
  if (!Number.isNaN(utcMs)) return utcMs;
  throw new Unusable(`--start ${text}: an instant with its zone is needed, for example 2000-01-01T00:00:00Z.`);
}

function faultOf(text: string): SimulatedRun['faults'][number] {
  const [, kind = '', seconds = ''] = /^([a-z-]+)@(\d+(?:\.\d+)?)$/.exec(text) ?? [];
  if (isFaultKind(kind)) return { kind, atS: Number(seconds) };
  throw new Unusable(`--fault ${text}: KIND@SECONDS is needed, for example link-drop@600; the kinds are ${faultKinds.join(', ')}.`);
}

function emptyFolder(folder: string | undefined): string {
  if (folder === undefined) throw new Unusable(`--out DIR is needed: the folder into which the archive is written.\n${usage}`);
  if (!existsSync(folder)) return folder;
  if (!statSync(folder).isDirectory()) throw new Unusable(`--out ${folder} is a file; name a folder that is new or empty.`);
  if (readdirSync(folder).length > 0) throw new Unusable(`--out ${folder} is not empty; name a folder that is new or empty.`);
  return folder;
}

/** Makes the folder before hours are simulated for nothing. */
function makeFolder(folder: string): void {
  try {
    mkdirSync(folder, { recursive: true });
  } catch (error) {
    throw new Unusable(`--out ${folder} cannot be made: ${error instanceof Error ? error.message : String(error)}`);
  }
}

/** What the protocol is refused for when it begins then, at the home edge, and a rehearsal that would fill the memory. */
function assertRehearsable({ document, rig, startUtcMs, simulated }: Request): void {
  const start = { utcMs: startUtcMs, angleDeg: rig.motion?.homeDeg ?? 0 };
  const refusedFor = (refusals: readonly Finding[]) => {
    if (refusals.length > 0) throw new Unusable(`The protocol "${document.name}" is refused:\n${listed(refusals)}`);
  };
  refusedFor(checkProtocol(document, rig, start));
  const timeline = planTimeline({ protocol: document, rig, timeZone: 'UTC' }, start);
  refusedFor(excursionOf(rig, timeline).refusals);
  const samples = timeline.durationS * simulated.rateHz;
  if (samples <= MOST_SAMPLES) return;
  throw new Unusable(
    `The rehearsal would leave ${Math.round(samples)} samples; at most ${MOST_SAMPLES} are written. Accepted is a --rate up to ${((simulated.rateHz * MOST_SAMPLES) / samples).toPrecision(2)}.`,
  );
}

/** The simulated pendulum needs its torque and its free oscillation. */
function assertSimulable(rig: RigDocument): void {
  geometryOf(rig);
  if (oscillatorOf(rig) === null)
    throw new Unusable('The rig cannot be simulated: measured.period_s and measured.decayTime_s are needed in its document.');
}

/** The rehearsal's id: the same for the same input. */
function runIdOf({ document, rig, startUtcMs, simulated, board }: Request): string {
  const hash = sha256Hex(canonicalJson({ document, rig, startUtcMs, simulated, ...(board ? { board } : {}) }));
  return [hash.slice(0, 8), hash.slice(8, 12), `8${hash.slice(13, 16)}`, `8${hash.slice(17, 20)}`, hash.slice(20, 32)].join('-');
}

function runStart(request: Request): RunStart & { simulated: SimulatedRun } {
  const { document, rig, simulated } = request;
  return {
    labId: 'rehearsal',
    runId: runIdOf(request),
    rigId: 'simulated-rig',
    rigName: 'Simulated rig',
    rigRevision: 1,
    protocolName: document.name,
    protocolRevision: 1,
    rig,
    protocol: document,
    massSetLabel: rig.sources.shape === 'none' ? 'empty' : 'as in rig.json',
    timeZone: 'UTC',
    operator: 'rehearsal',
    notes: document.notes ?? '',
    arm: null,
    ...(isShuffled(document) ? { shuffleSeed: simulated.seed } : {}),
    simulated,
  };
}

function writeArchive(folder: string, start: RunStart, result: Rehearsal): void {
  const { outcome, steps, events, channels, startedAtUtcMs, endedAtUtcMs } = result;
  const { runId, operator, notes, massSetLabel, shuffleSeed, simulated, rig, protocol } = start;
  const files = buildArchive(
    {
      run: { runId, outcome, operator, startedAtUtcMs, endedAtUtcMs, notes, massSetLabel, shuffleSeed, simulated },
      rig,
      protocol,
      steps,
      events,
      channels,
      createdAt: new Date(endedAtUtcMs).toISOString(),
      software: `Evenfall ${packageJson.version}`,
      title: `Rehearsal: ${protocol.name}`,
    },
    sha256Hex,
  );
  writeArchiveFolder(files, folder);
}

async function run(args: readonly string[]): Promise<Record<string, unknown>> {
  const beganMs = performance.now();
  const request = requested(args);
  const { rig, startUtcMs, folder } = request;
  assertRehearsable(request);
  assertSimulable(rig);
  makeFolder(folder);
  const start = runStart(request);
  const result = await rehearse({ start, startUtcMs }, rehearsalParts(request.board ? 'board' : 'light'));
  writeArchive(folder, start, result);
  return {
    outcome: result.outcome,
    simulated_s: Math.round(result.simulatedS * 1e6) / 1e6,
    elapsed_s: Math.round(performance.now() - beganMs) / 1000,
    steps: result.steps.length,
    holds: result.holds,
    archive: folder,
  };
}

export interface Output {
  out: (text: string) => void;
  err: (text: string) => void;
}

const toProcess: Output = { out: (text) => process.stdout.write(text), err: (text) => process.stderr.write(text) };

/** The command: one JSON object on `out` and 0, or a message on `err` and 2. `args` are those after the command's name. */
export async function main(args: readonly string[], output: Output = toProcess): Promise<number> {
  try {
    output.out(`${JSON.stringify(await run(args))}\n`);
    return 0;
  } catch (error) {
    if (error instanceof BeyondFirmware) output.err(`rehearse: The rig cannot be driven by the controller board: ${error.message}\n`);
    else if (error instanceof Unusable) output.err(`rehearse: ${error.message}\n`);
    else throw error;
    return 2;
  }
}

if (require.main === module) void main(process.argv.slice(2)).then((code) => void (process.exitCode = code));
