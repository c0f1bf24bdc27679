import { readdir, realpath } from 'node:fs/promises';
import { join } from 'node:path';
import { SerialPort } from 'serialport';
import type { ListedPort, UsbIdentity } from '../interfaces/serial-ports';

/** Links that Linux makes, named after the device and not after the order of plugging. */
const STABLE_NAMES = '/dev/serial/by-id';

/** The serial ports of this computer; none where they cannot be listed. Pseudo-terminals are not listed: give their path. */
export async function listPorts(): Promise<ListedPort[]> {
  const [ports, stable] = await Promise.all([SerialPort.list().catch(() => []), stableNames(STABLE_NAMES)]);
  return ports.map(({ path, manufacturer, serialNumber, vendorId, productId }) => ({
    path,
    stablePath: stable.get(path) ?? null,
    label: manufacturer ?? null,
    usb: serialNumber && vendorId && productId ? { vendorId, productId, serialNumber } : null,
  }));
}

/** Port → the stable name that leads to it. */
export async function stableNames(folder: string): Promise<Map<string, string>> {
  const names = await readdir(folder).catch(() => []);
  const pairs = names.map(async (name): Promise<[string, string]> => [
    await realpath(join(folder, name)).catch(() => ''),
    join(folder, name),
  ]);
  return new Map((await Promise.all(pairs)).filter(([port]) => port !== ''));
}

export function isSameDevice(a: UsbIdentity | null, b: UsbIdentity | null): boolean {
  return a !== null && b !== null && a.serialNumber === b.serialNumber && a.vendorId === b.vendorId && a.productId === b.productId;
}
