import * as fc from 'fast-check';
import { mkdirSync, mkdtempSync, rmSync, symlinkSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { ListedPort } from '@/server/interfaces/serial-ports';
import { findPort } from '@/server/links/find-port';
import { stableNames } from '@/server/links/port-list';

/** Paths that no test machine has, so that each stands for a port that is gone. */
const gone = '/dev/ttyUSB77';
const usb = { vendorId: '1a86', productId: '7523', serialNumber: 'A5001' };
const port = (path: string, more: Partial<ListedPort> = {}): ListedPort => ({ path, stablePath: null, label: null, usb: null, ...more });
const listed =
  (...ports: ListedPort[]) =>
  async () =>
    ports;

describe('a port that is not under its path any more', () => {
  test('is found under the name that it has come back with, and the stable name is recommended', async () => {
    const here = port('/dev/ttyUSB78', { usb, stablePath: '/dev/serial/by-id/usb-1a86_A5001' });
    const found = await findPort({ path: gone, usb }, listed(port('/dev/ttyUSB79', { usb: { ...usb, serialNumber: 'B7' } }), here));
    expect(found).toEqual({
      path: '/dev/ttyUSB78',
      isReal: true,
      usb,
      remark:
        "The controller's port /dev/ttyUSB77 has come back as /dev/ttyUSB78. Choose /dev/serial/by-id/usb-1a86_A5001, which stays the same whatever is plugged in.",
    });
  });

  test.each([
    ['none like it is listed', listed(port('/dev/ttyUSB78', { usb: { ...usb, productId: '7524' } }))],
    ['two are that cannot be told apart', listed(port('/dev/ttyUSB78', { usb }), port('/dev/ttyUSB79', { usb }))],
    ['nothing is listed', listed()],
  ])('is missing when %s', async (_name, list) => {
    await expect(findPort({ path: gone, usb }, list)).rejects.toMatchObject({
      code: 'missing',
      message: expect.stringContaining(`There is no port ${gone}. Plug the controller in`),
    });
  });

  test('is missing when it was never known what was plugged in there', async () => {
    await expect(findPort({ path: gone, usb: null }, listed(port('/dev/ttyUSB78', { usb })))).rejects.toMatchObject({ code: 'missing' });
  });
});

test('a strange device that has taken the name is not spoken to', async () => {
  const strange = listed(port(gone, { usb: { ...usb, serialNumber: 'C9' } }));
  await expect(findPort({ path: gone, usb }, strange)).rejects.toMatchObject({
    code: 'another-device',
    message: expect.stringContaining('is another device now'),
  });
});

test('wherever it is plugged in again and whatever takes its old name, its own port is opened or none', async () => {
  const names = [gone, '/dev/ttyUSB78', '/dev/ttyUSB79', '/dev/ttyACM77'];
  const device = fc.constantFrom(usb, { ...usb, serialNumber: 'B7' }, { ...usb, vendorId: '2341' }, null, 'nothing' as const);
  await fc.assert(
    fc.asyncProperty(fc.array(fc.tuple(device, device, device, device), { minLength: 1, maxLength: 8 }), async (pluggings) => {
      for (const plugged of pluggings) {
        const ports = names.flatMap((path, index) => {
          const what = plugged[index];
          return what === undefined || what === 'nothing' ? [] : [port(path, { usb: what })];
        });
        const own = ports.filter((one) => one.usb === usb).map(({ path }) => path);
        const found = await findPort({ path: gone, usb }, listed(...ports)).catch(({ code }: { code: string }) => code);
        if (own.length === 1) expect(found).toMatchObject({ path: own[0], usb });
        else expect(['missing', 'another-device']).toContain(found);
      }
    }),
    { numRuns: 50, seed: 77 },
  );
});

test('stable names are found by where they lead', async () => {
  const folder = mkdtempSync(join(tmpdir(), 'evenfall-ports-'));
  mkdirSync(join(folder, 'by-id'));
  symlinkSync('/dev/null', join(folder, 'by-id', 'usb-maker-A5001'));
  symlinkSync(join(folder, 'nothing'), join(folder, 'by-id', 'usb-dangling'));
  expect([...(await stableNames(join(folder, 'by-id')))]).toEqual([['/dev/null', join(folder, 'by-id', 'usb-maker-A5001')]]);
  expect(await stableNames(join(folder, 'not-here'))).toEqual(new Map());
  rmSync(folder, { recursive: true });
});
