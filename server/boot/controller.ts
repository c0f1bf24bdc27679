import { readFileSync, rmSync } from 'node:fs';
import { createServer, type Socket } from 'node:net';
import { parseArgs } from 'node:util';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { rigDocumentSchema, type RigMotion } from '@/shared/rig/document';
import { createEmulatedController } from '../links/board/board-controller';
import { createSimulatedController, type SimulatedController } from '../links/simulated-controller';
import { RealClock } from './real-clock';

/**
 * A controller with a simulated turntable as a process of its own, in real time: it speaks the line protocol on standard
 * input and output. With socat it stands behind a pseudo-terminal, so that a real serial port talks to it:
 *
 *   socat PTY,link=/tmp/turntable,rawer,echo=0 EXEC:"node --import tsx server/boot/controller.ts --homed --warned"
 *
 * Its turntable can be watched and disturbed through `--control SOCKET` (words below), which is how the simulated balance of
 * another process can follow the true angle.
 */
const usage = `Usage: controller [options]
  --rig FILE         rig document (JSON) with motion data; default: the demo rig
  --seed N           of boot identifier and noise; default: the time, so that each start has a boot identifier of its own
  --board            the controller's firmware on the emulated board instead of the light simulated controller
  --homed            the position is known from the start; else it must be homed first
  --warned           the warning of 10 s before the first motion has been given
  --protocol N.N     version of the line protocol that it claims; default: its own
  --babble           talks nonsense and answers nothing, like another device
  --control SOCKET   Unix socket that takes, a line each: angle, reset, interlock open, interlock closed, supply lost,
                     supply present, key on, key off, drop MS, garbage MS, freeze MS, slip STEPS`;

/** No byte times of its own: the line it speaks on has them, or has none. */
const endlessRate = 1e9;
const babbleMs = 50;

class Unusable extends Error {}

interface Options {
  rig: RigMotion;
  seed: number;
  homed: boolean;
  warned: boolean;
  version: { major: number; minor: number } | null;
  board: boolean;
  babble: boolean;
  control: string | null;
}

function optionsOf(args: string[]): Options {
  const { values } = parsed(args);
  const version = values.protocol === undefined ? null : /^(\d{1,2})\.(\d{1,2})$/.exec(values.protocol);
  if (values.protocol !== undefined && version === null)
    throw new Unusable(`--protocol ${values.protocol}: a version is two numbers, for example 2.0`);
  const seed = Number(values.seed ?? Math.floor(Date.now() / 1000) % 2 ** 24);
  if (!Number.isInteger(seed)) throw new Unusable(`--seed ${values.seed}: a whole number is needed`);
  return {
    rig: motionOf(values.rig),
    seed,
    homed: values.homed ?? false,
    warned: values.warned ?? false,
    version: version ? { major: Number(version[1]), minor: Number(version[2]) } : null,
    board: values.board ?? false,
    babble: values.babble ?? false,
    control: values.control ?? null,
  };
}

function parsed(args: string[]) {
  const text = { type: 'string' } as const;
  const flag = { type: 'boolean' } as const;
  try {
    const flags = { board: flag, homed: flag, warned: flag, babble: flag };
    return parseArgs({ args, options: { ...flags, rig: text, seed: text, protocol: text, control: text } });
  } catch (error) {
    throw new Unusable(`${(error as Error).message}\n${usage}`);
  }
}

function motionOf(file: string | undefined): RigMotion {
  const document = file === undefined ? demoRigWide : rigDocumentSchema.parse(JSON.parse(readFileSync(file, 'utf8')));
  if (document.motion === undefined) throw new Unusable(`${file}: the rig document has no "motion"; a turntable needs it`);
  return document.motion;
}

/** Another device on the port: lines of nonsense, for ever. */
function babble(): void {
  const words = ['$GPX,', 'T=21.4C', '\u00fe\u0007', '0x3f 0x11', 'READY>', '~~~~'];
  let turn = 0;
  setInterval(() => process.stdout.write(`${words[turn++ % words.length]} ${turn}\r\n`, 'latin1'), babbleMs);
  process.stdin.resume();
}

async function speak(controller: SimulatedController): Promise<void> {
  const line = await controller.factory.open({
    onLine: (text) => process.stdout.write(`${text}\n`, 'latin1'),
    onClosed: () => process.exit(0),
  });
  process.stdin.setEncoding('latin1');
  process.stdin.on('data', (chunk: string) => line.write(chunk));
}

/** What the control socket understands; each gives its answer. */
function obey(controller: SimulatedController, words: string): string {
  const [word, rest] = words.trim().split(' ');
  const number = Number(rest);
  const done = (deed: () => void) => {
    deed();
    return 'done';
  };
  switch (word) {
    case 'angle': {
      const utcMs = Date.now();
      return JSON.stringify({ utcMs, angleDeg: controller.trueAngleDegAt(utcMs) });
    }
    case 'reset':
      return done(() => controller.reset('button'));
    case 'interlock':
      return done(() => (rest === 'open' ? controller.openInterlock() : controller.closeInterlock()));
    case 'supply':
      return done(() => (rest === 'lost' ? controller.loseSupply() : controller.returnSupply()));
    case 'key':
      return done(() => controller.turnArmKey(rest === 'on'));
    case 'drop':
      return done(() => controller.dropLine(number));
    case 'garbage':
      return done(() => controller.garbage(number));
    case 'freeze':
      return done(() => controller.freeze(number));
    case 'slip':
      return done(() => controller.slip(number));
    default:
      return `not understood: ${words.trim()}`;
  }
}

function listen(controller: SimulatedController, path: string): void {
  rmSync(path, { force: true });
  const serve = (socket: Socket) => {
    let rest = '';
    socket.setEncoding('utf8');
    socket.on('error', () => socket.destroy());
    socket.on('data', (chunk: string) => {
      const lines = (rest + chunk).split('\n');
      rest = lines.pop() ?? '';
      for (const words of lines) socket.write(`${obey(controller, words)}\n`);
    });
  };
  createServer(serve).listen(path).unref();
}

async function main(): Promise<void> {
  const { rig, version, control, babble: babbles, board, ...rest } = optionsOf(process.argv.slice(2));
  // The other end hung up: there is nobody left to talk to.
  process.stdin.on('end', () => process.exit(0));
  process.stdout.on('error', () => process.exit(0));
  if (babbles) return babble();
  const clock = new RealClock();
  const light = { uptimeS: 0.5, baudRate: endlessRate, ...(version === null ? {} : { version }) };
  const controller = board
    ? createEmulatedController({ clock, rig, seed: rest.seed, homed: rest.homed })
    : createSimulatedController({ clock, rig, ...rest, ...light });
  if (control !== null) listen(controller, control);
  await speak(controller);
}

main().catch((error: unknown) => {
  process.stderr.write(`controller: ${error instanceof Error ? error.message : String(error)}\n`);
  process.exitCode = 2;
});
