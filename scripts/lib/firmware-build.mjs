import { createHash } from 'node:crypto';
import { existsSync, mkdirSync, readdirSync, readFileSync, renameSync, rmSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { outside, root } from './paths.mjs';
import { must } from './run.mjs';

export const firmwareFolder = join(root, 'firmware-protocol', 'firmware');
export const boardImage = join(firmwareFolder, 'evenfall.hex');

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

/** Flash and static memory in bytes. */
export async function sizesOf(elf) {
  const [text, data, bss] = (await must('avr-size', [elf])).split('\n')[1].trim().split(/\s+/).map(Number);
  return { flash: text + data, memory: data + bss };
}
