import { accessSync, constants, existsSync, readdirSync } from 'node:fs';
import { join } from 'node:path';
import { must } from './run.mjs';
import { giveUp, say, waiting } from './say.mjs';

function onPath(program) {
  const folders = (process.env.PATH ?? '').split(':').concat('/usr/bin', '/usr/sbin');
  return folders.some((folder) => {
    try {
      accessSync(join(folder, program), constants.X_OK);
      return true;
    } catch {
      return false;
    }
  });
}

/** The newest PostgreSQL of Debian's packages: its `bin` folder and major version, or null. */
export function findPostgres() {
  const base = '/usr/lib/postgresql';
  try {
    const majors = readdirSync(base)
      .filter((name) => onDisk(join(base, name, 'bin', 'postgres')))
      .map(Number)
      .sort((a, b) => b - a);
    return majors[0] === undefined ? null : { bin: join(base, String(majors[0]), 'bin'), major: majors[0] };
  } catch {
    return null;
  }
}

function onDisk(path) {
  try {
    accessSync(path, constants.X_OK);
    return true;
  } catch {
    return false;
  }
}

const present = {
  postgresql: () => findPostgres() !== null && onPath('psql'),
  'chromium-headless-shell': () => onPath('chromium-headless-shell'),
  socat: () => onPath('socat'),
  'g++': () => onPath('g++'),
  'gcc-avr': () => onPath('avr-g++'),
  'avr-libc': () => existsSync('/usr/lib/avr/include/avr/io.h'),
  ser2net: () => onPath('ser2net'),
  mosquitto: () => onPath('mosquitto'),
  openssl: () => onPath('openssl'),
};

/** Makes sure that Debian's packages are there: installs them when root, else says the exact command and ends. */
export async function ensureDebianPackages(names) {
  const missing = names.filter((name) => !present[name]());
  if (missing.length === 0) return;
  const install = ['install', '-y', '--no-install-recommends', '-o', 'DPkg::Lock::Timeout=300', ...missing];
  if (process.getuid?.() !== 0)
    giveUp(`Missing: ${missing.join(', ')}. Please run:\n  sudo apt-get update && sudo apt-get ${install.join(' ')}\nand start again.`);
  say(`Installing from Debian's packages: ${missing.join(', ')}.`);
  const env = { ...process.env, DEBIAN_FRONTEND: 'noninteractive' };
  await waiting('waiting for apt-get update', () => must('apt-get', ['update', '-q', '-o', 'DPkg::Lock::Timeout=300'], { env }));
  await waiting(`waiting for apt-get to install ${missing.join(', ')}`, () => must('apt-get', install, { env }));
  const still = missing.filter((name) => !present[name]());
  if (still.length > 0) giveUp(`apt-get installed ${still.join(', ')}, yet the programs are not found. Is this Debian 12?`);
}
