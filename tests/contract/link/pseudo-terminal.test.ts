import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { createLink } from '@/server/links/link-driver';
import { serialFactory } from '@/server/links/serial-line';
import { benchRig } from './bench';
import { linkConformance } from './conformance';
import { sleep } from '@/scripts/soak/board/controller-process';
import { ProcessBenches } from './process-benches';

/** Real time: a controller process behind a pseudo-terminal, spoken to through the real serial port class. */
jest.setTimeout(60_000);

const benches = new ProcessBenches((process, clock) => serialFactory({ path: process.path, baudRate: 115_200, dtr: true }, clock));
const { clock } = benches;

linkConformance(benches.maker('a pseudo-terminal'));

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
    for (let turns = 0; link.health().condition === 'opening' && turns < 1000; turns += 1) await sleep(10);
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

  test('that is another kind of device is not touched', async () => {
    for (const path of ['/dev/null', '/dev/tty'])
      await expect(opened(path)).rejects.toMatchObject({
        code: 'not-a-port',
        message: `${path} is a device, but not a serial port. Choose the path of the controller's port.`,
      });
  });

  test('that another program holds is told to be in use, and is opened when it is free', async () => {
    const process = await benches.start('--homed', '--warned');
    const factory = serialFactory({ path: process.path, baudRate: 115_200 }, clock);
    const holder = await factory.open({ onLine: () => undefined, onClosed: () => undefined });
    await expect(opened(process.path)).rejects.toMatchObject({
      code: 'locked',
      message: expect.stringContaining('in use by another program'),
    });
    const link = createLink({ factory, clock, rig: benchRig, epoch: 1 });
    link.open();
    for (let turns = 0; link.health().condition === 'opening' && turns < 1000; turns += 1) await sleep(10);
    expect(link.health().detail).toContain('in use by another program');
    await holder.close();
    await (await benches.on(process)).until('the link after the other program closed', () => link.health().condition === 'ready', 10_000);
    await link.close();
    await process.dispose();
  });
});
