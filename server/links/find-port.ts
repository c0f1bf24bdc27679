import { realpath, stat } from 'node:fs/promises';
import { basename, resolve } from 'node:path';
import type { ListedPort, UsbIdentity } from '../interfaces/serial-ports';
import { LineError } from './line-error';
import { isSameDevice } from './port-list';

const PSEUDO_TERMINALS = '/dev/pts/';
/** Names of serial ports: ttyS0, ttyUSB0, ttyACM0, ttyAMA0, rfcomm0, cu.usbmodem1. The consoles (tty, tty1, console) are none, nor is a watchdog. */
const SERIAL_NAME = /^(tty[A-Z][A-Za-z]*\d+|rfcomm\d+|(tty|cu)\..+)$/;

export interface FoundPort {
  path: string;
  /** Its bytes take the time of the rate; those of a pseudo-terminal take none. */
  isReal: boolean;
  usb: UsbIdentity | null;
  /** Set when it is another path than the one asked for. */
  remark?: string;
}

/**
 * The port behind a path. Names like ttyUSB0 go by the order of plugging: a known device that has come back under another name
 * is found there, and a strange one that has taken its name is not spoken to.
 * @throws LineError
 */
export async function findPort(wanted: { path: string; usb: UsbIdentity | null }, list: () => Promise<ListedPort[]>): Promise<FoundPort> {
  const { path, usb } = wanted;
  const found = await stat(path).catch(() => null);
  if (found?.isDirectory()) throw new LineError('not-a-port', `${path} is a folder, not a serial port. Choose the port's own path.`);
  if (found?.isCharacterDevice() === false)
    throw new LineError('not-a-port', `${path} is a file, not a serial port. Choose the path of the controller's port.`);
  const place = await realpath(path).catch(() => resolve(path));
  if (found !== null && place.startsWith(PSEUDO_TERMINALS)) return { path, isReal: false, usb: null };
  if (found !== null && !SERIAL_NAME.test(basename(place)))
    throw new LineError('not-a-port', `${path} is a device, but not a serial port. Choose the path of the controller's port.`);
  const ports = await list();
  const here = ports.find((port) => port.path === place)?.usb ?? null;
  if (found !== null && (usb === null || here === null || isSameDevice(usb, here))) return { path, isReal: true, usb: here ?? usb };
  return elsewhere(path, usb, ports);
}

function elsewhere(path: string, usb: UsbIdentity | null, ports: readonly ListedPort[]): FoundPort {
  const [same, ...more] = ports.filter((port) => isSameDevice(port.usb, usb));
  if (same === undefined || more.length > 0) {
    const isTaken = ports.some((port) => port.path === path);
    throw isTaken
      ? new LineError('another-device', `${path} is another device now, and the controller's own is not there. Plug the controller in.`)
      : new LineError('missing', `There is no port ${path}. Plug the controller in, or choose the path under which it appears.`);
  }
  const advice = same.stablePath === null ? '' : ` Choose ${same.stablePath}, which stays the same whatever is plugged in.`;
  return { path: same.path, isReal: true, usb, remark: `The controller's port ${path} has come back as ${same.path}.${advice}` };
}
