import { createHash } from 'node:crypto';
import { existsSync, mkdirSync, readdirSync, readFileSync, renameSync, rmSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { outside, root } from './paths.mjs';
import { must } from './run.mjs';

export const firmwareFolder = join(root, 'firmware-protocol', 'firmware');
export const boardImage = join(firmwareFolder, 'evenfall.hex');
/** Where the image keeps its variables, for tests that set counters and clocks by hand. */
export const boardSymbols = join(firmwareFolder, 'evenfall.symbols.json');
/** Address 0 of the data memory, as the linker writes it. */
const DATA_MEMORY = 0x80_0000;

const COMMON = ['-std=c++14', '-Wall', '-Wextra', '-Werror', '-fno-exceptions', '-fno-rtti'];
/** Size first: -Os; one program for the optimizer: -flto; no guard around what is made at the first use. */
const BOARD = [
  '-mmcu=atmega328p',
  '-DF_CPU=16000000UL',
  '-Os',
  '-flto',
  '-fwhole-program',
  '-fno-threadsafe-statics',
  '-frandom-seed=evenfall',
];

/** Errors that memory or arithmetic would hide end the program. */
const HOST = ['-O1', '-g', '-fsanitize=address,undefined', '-fno-sanitize-recover=all'];

const filesIn = (...folders) =>
  folders.flatMap((folder) =>
    readdirSync(join(firmwareFolder, folder))
      .sort()
      .map((name) => `${folder}/${name}`),
  );
const sources = (...folders) => filesIn(...folders).filter((name) => name.endsWith('.cpp'));

/** An empty folder outside the project for what a build leaves. */
function buildFolder(name) {
  const folder = join(outside, `firmware-${name}`);
  rmSync(folder, { recursive: true, force: true });
  mkdirSync(folder, { recursive: true });
  return folder;
}

/** Builds the image for the board. The same sources and the same compiler give the same bytes, wherever they lie. */
export async function buildBoard() {
  const folder = buildFolder('board');
  const elf = join(folder, 'evenfall.elf');
  const hex = join(folder, 'evenfall.hex');
  await must('avr-g++', [...BOARD, ...COMMON, ...sources('core', 'board'), '-o', elf], { cwd: firmwareFolder });
  await must('avr-objcopy', ['-O', 'ihex', '-R', '.eeprom', elf, hex]);
  return { elf, hex };
}

/** The core as a program for tests, built when its sources changed. Gives its path. */
export async function ensureHostBuild() {
  const hash = createHash('sha256').update(HOST.join(' '));
  for (const name of filesIn('core', 'hal', 'host')) hash.update(name).update(readFileSync(join(firmwareFolder, name)));
  const program = join(outside, `firmware-host-${hash.digest('hex').slice(0, 12)}`);
  if (existsSync(program)) return program;
  const made = join(buildFolder(`host-${process.pid}`), 'program');
  await must('g++', [...HOST, ...COMMON, ...sources('core', 'host'), '-o', made], { cwd: firmwareFolder });
  renameSync(made, program);
  rmSync(dirname(made), { recursive: true });
  return program;
}

/** Name → address in the data memory, of all variables of the program; what the optimizer appended to a name is taken off. */
export async function symbolsOf(elf) {
  const lines = (await must('avr-nm', ['--defined-only', elf])).split('\n').map((line) => line.split(' '));
  const variables = lines.filter(([, type]) => /^[bd]$/i.test(type ?? ''));
  const names = await must('avr-c++filt', [], {
    input: variables.map(([, , name]) => `${name.replace(/\.lto_priv\.\d+$/, '')}\n`).join(''),
  });
  const named = names
    .trimEnd()
    .split('\n')
    .map((name, index) => [name.replace('(anonymous namespace)::', ''), variables[index][0]]);
  const ours = named.filter(([name]) => name.includes('::')).map(([name, address]) => [name, Number.parseInt(address, 16) - DATA_MEMORY]);
  return `${JSON.stringify(Object.fromEntries(ours.sort(([, a], [, b]) => a - b)), null, 2)}\n`;
}

/** Flash and static memory in bytes. */
export async function sizesOf(elf) {
  const [text, data, bss] = (await must('avr-size', [elf])).split('\n')[1].trim().split(/\s+/).map(Number);
  return { flash: text + data, memory: data + bss };
}
