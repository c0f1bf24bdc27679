import { execFileSync } from 'node:child_process';
import { join } from 'node:path';

/** The firmware's core as a program of this machine: see `firmware-protocol/firmware/host/main.cpp`. */

const root = join(__dirname, '..', '..', '..');
const TICKS_PER_US = 2;

let program: string | undefined;

function hostProgram(): string {
  program ??= execFileSync(process.execPath, [join(root, 'scripts', 'firmware.mjs'), '--host'], {
    encoding: 'utf8',
    timeout: 120_000,
  }).trim();
  return program;
}

/** The core allocates nothing, so there is no leak to look for; the search takes longer than most runs. */
const env = { ...process.env, ASAN_OPTIONS: 'detect_leaks=0' };

/** Throws when the program ends in any other way than well: a sanitizer's finding is its message. */
function drive(mode: 'read' | 'run', input: string): string[] {
  const output = execFileSync(hostProgram(), [mode], { input, encoding: 'utf8', maxBuffer: 1 << 30, timeout: 240_000, env });
  return output.split('\n').slice(0, -1);
}

/** A piece that is none: what was begun before it is forgotten. */
export const FRESH = 'fresh';

export const hexOf = (bytes: string) => Buffer.from(bytes, 'latin1').toString('hex');

/** What the firmware reads from each piece of a byte stream: a description of each line, blank ones excepted. `fresh` begins another stream. */
export function readByFirmware(pieces: readonly string[]): string[][] {
  const lists: string[][] = [];
  let current: string[] = [];
  for (const line of drive('read', `${pieces.map((piece) => (piece === FRESH ? FRESH : hexOf(piece))).join('\n')}\n`)) {
    if (line !== '.') current.push(line);
    else {
      lists.push(current);
      current = [];
    }
  }
  return lists;
}

/** A line that the firmware sent, and when, µs since its last start. */
export interface Sent {
  atUs: number;
  line: string;
}

export interface HostRun {
  sent: Sent[];
  /** Each step: µs since the last start, and its direction. */
  steps: { atUs: number; direction: 1 | -1 }[];
  /** Of each `dump`. */
  dumps: { memory: string; writes: number; place: number; driversOn: boolean; warningOn: boolean }[];
}

/** Entries of `[time in µs since the beginning, what]`, in order of time. */
export type Script = readonly (readonly [number, string])[];

/** Runs scripts, each on a board of its own. */
export function runFirmware(scripts: readonly Script[]): HostRun[] {
  const text = (script: Script) => script.map(([us, what]) => `${Math.round(us * TICKS_PER_US)} ${what}\n`).join('');
  const lines = drive('run', scripts.map(text).join('0 again\n'));
  const runs: HostRun[] = [{ sent: [], steps: [], dumps: [] }];
  for (let index = 0; index < lines.length; index += 1) {
    const run = runs.at(-1) as HostRun;
    const [first = '', second = '', ...more] = (lines[index] as string).split(' ');
    if (first === 'again') runs.push({ sent: [], steps: [], dumps: [] });
    else if (first === 'memory') {
      index += 1;
      const [, place, , drivers, , warning] = (lines[index] as string).split(' ');
      const [memory = ''] = more;
      run.dumps.push({ memory, writes: Number(second), place: Number(place), driversOn: drivers === '1', warningOn: warning === '1' });
    } else if (second === 'step') run.steps.push({ atUs: Number(first) / TICKS_PER_US, direction: more[0] === '1' ? 1 : -1 });
    else run.sent.push({ atUs: Number(first) / TICKS_PER_US, line: [second, ...more].join(' ') });
  }
  return runs;
}
