import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { RealClock } from '@/server/boot/real-clock';
import { createLink } from '@/server/links/link-driver';
import { assertPseudoTerminal, serialFactory } from '@/server/links/serial-line';
import { benchRig, type BenchMaker, type LinkBench } from './bench';
import { linkConformance } from './conformance';
import { ControllerProcess, sleep } from './controller-process';

/** Real time: a controller process behind a pseudo-terminal, spoken to through the real serial port class. */
jest.setTimeout(60_000);

const clock = new RealClock();
const started: ControllerProcess[] = [];
/** A controller whose position is known still; starting one takes a second or two. */
let kept: ControllerProcess | null = null;

async function startController(...options: string[]): Promise<ControllerProcess> {
  const process = new ControllerProcess(options);
  started.push(process);
  await process.start();
  return process;
}

function benchOn(process: ControllerProcess): LinkBench {
  const spoil = () => {
    if (kept === process) kept = null;
  };
  const tell = async (words: string) => void (await process.tell(words));
  return {
    clock,
    factory: serialFactory({ path: process.path, baudRate: 115_200, dtr: true }, clock),
    until: async (what, met, withinMs) => {
      const giveUpMs = clock.monotonicMs() + 2 * withinMs;
      while (!met()) {
        if (clock.monotonicMs() > giveUpMs) throw new Error(`within ${2 * withinMs} ms there was no ${what}`);
        await sleep(5);
      }
    },
    pass: sleep,
    trueAngleDeg: async () => (JSON.parse(await process.tell('angle')) as { angleDeg: number }).angleDeg,
    reset: () => {
      spoil();
      return tell('reset');
    },
    drop: (ms) => tell(`drop ${ms}`),
    garbage: (ms) => tell(`garbage ${ms}`),
    interlock: (level) => tell(`interlock ${level}`),
    armKey: (level) => tell(`key ${level}`),
    unplug: () => process.unplug(),
    plug: () => process.plug(),
    dispose: async () => {
      if (kept !== process) await process.dispose();
    },
  };
}

const maker: BenchMaker = {
  name: 'a pseudo-terminal',
  firmware: 'simulated',
  // Half of the round trip of a busy machine, and a wall clock read to 1 ms.
  beginToleranceS: 0.1,
  noiseMs: 400,
  make: async () => {
    kept ??= await startController('--homed', '--warned');
    return benchOn(kept);
  },
  makeStranger: async (kind) => benchOn(await startController(...(kind === 'babble' ? ['--babble'] : ['--protocol', '2.0']))),
  dispose: async () => {
    for (const process of started) await process.dispose();
  },
};

linkConformance(maker);

describe('a path that cannot be opened', () => {
  const folder = mkdtempSync(join(tmpdir(), 'evenfall-paths-'));
  afterAll(() => rmSync(folder, { recursive: true }));
  const opened = (path: string) =>
    serialFactory({ path, baudRate: 115_200 }, clock).open({ onLine: () => undefined, onClosed: () => undefined });

  test('that does not exist is named, with what would be right', async () => {
    const path = join(folder, 'nothing-here');
    await expect(opened(path)).rejects.toMatchObject({
      code: 'missing',
      message: `There is no port ${path}. Plug the controller in, or choose the path under which it appears.`,
    });
    const link = createLink({ factory: serialFactory({ path, baudRate: 115_200 }, clock), clock, rig: benchRig, epoch: 1 });
    link.open();
    await sleep(400);
    expect(link.health()).toMatchObject({ condition: 'lost', detail: expect.stringContaining('There is no port') });
    await link.close();
  });

  test('that is a plain file or a folder is no port', async () => {
    const path = join(folder, 'plain.txt');
    writeFileSync(path, 'no port');
    await expect(opened(path)).rejects.toMatchObject({
      code: 'not-a-port',
      message: expect.stringContaining('is a file, not a serial port'),
    });
    await expect(opened(folder)).rejects.toMatchObject({ code: 'not-a-port', message: expect.stringContaining('is a folder') });
  });

  test('that is a real device is for a later version', async () => {
    await expect(opened('/dev/null')).rejects.toMatchObject({ code: 'not-yet' });
    await expect(assertPseudoTerminal('/dev/ttyUSB7')).rejects.toMatchObject({ code: 'not-yet' });
    await expect(assertPseudoTerminal(join(folder, 'to-come'))).resolves.toBeUndefined();
  });

  test('that another program holds is told to be in use, and is opened when it is free', async () => {
    const process = await startController('--homed', '--warned');
    const factory = serialFactory({ path: process.path, baudRate: 115_200 }, clock);
    const holder = await factory.open({ onLine: () => undefined, onClosed: () => undefined });
    await expect(opened(process.path)).rejects.toMatchObject({
      code: 'locked',
      message: expect.stringContaining('in use by another program'),
    });
    const link = createLink({ factory, clock, rig: benchRig, epoch: 1 });
    link.open();
    await sleep(300);
    expect(link.health().detail).toContain('in use by another program');
    await holder.close();
    await benchOn(process).until('the link after the other program closed', () => link.health().condition === 'ready', 10_000);
    await link.close();
    await process.dispose();
  });
});
