import { SerialPort } from 'serialport';
import type { ByteLineFactory } from '../interfaces/byte-line';
import type { Clock } from '../interfaces/clock';
import type { ListedPort, UsbIdentity } from '../interfaces/serial-ports';
import { findPort } from './find-port';
import { LineError } from './line-error';
import { listPorts } from './port-list';
import { StreamLine, type ByteStream } from './stream-line';

export interface SerialSettings {
  path: string;
  baudRate: number;
  /** Which device it was when the path was chosen; it is found again under another name. */
  usb?: UsbIdentity | undefined;
  /** Levels of the control lines after opening; a port that has no such lines keeps silent about it. */
  dtr?: boolean | undefined;
  rts?: boolean | undefined;
}

const BITS_PER_BYTE = 10;

/** The line over a serial port. Each opening makes a fresh port object: an old one would send what was written while it was closed. */
export function serialFactory(settings: SerialSettings, clock: Clock, list: () => Promise<ListedPort[]> = listPorts): ByteLineFactory {
  let usb = settings.usb ?? null;
  let byteTimeMs = 0;
  return {
    description: settings.path,
    // A pseudo-terminal does not throttle to the rate: its bytes take no time of their own.
    get byteTimeMs() {
      return byteTimeMs;
    },
    open: async (handlers) => {
      const found = await findPort({ path: settings.path, usb }, list);
      const port = new SerialPort({ path: found.path, baudRate: settings.baudRate, autoOpen: false, lock: true });
      await openPort(port, found.path);
      usb = found.usb;
      byteTimeMs = found.isReal ? (BITS_PER_BYTE * 1000) / settings.baudRate : 0;
      setControlLines(port, settings);
      const remark = found.remark === undefined ? {} : { remark: found.remark };
      const line = new StreamLine({ stream: new PortStream(port), handlers, clock, name: 'the port', ...remark });
      port.on('error', (error) => line.end(`the port reported an error: ${error.message}`));
      port.on('close', () => line.end('the port has disappeared'));
      port.on('data', (chunk: Buffer) => line.take(chunk));
      return line;
    },
  };
}

async function openPort(port: SerialPort, path: string): Promise<void> {
  await new Promise<void>((done, failed) => {
    port.open((error) => (error === null || error === undefined ? done() : failed(lineErrorOf(path, error.message))));
  });
}

function lineErrorOf(path: string, message: string): LineError {
  if (/lock/i.test(message))
    return new LineError('locked', `${path} is in use by another program. Close it there, then it opens here by itself.`);
  if (/permission|access/i.test(message)) {
    return new LineError(
      'no-permission',
      `The server may not open ${path}. Let its user into the group that owns serial ports (often "dialout") and start it anew.`,
    );
  }
  return new LineError('failed', `${path} could not be opened: ${message.replace(/^Error:?\s*/, '')}`);
}

/** Not every port has control lines; a pseudo-terminal refuses the call. */
function setControlLines(port: SerialPort, { dtr, rts }: SerialSettings): void {
  if (dtr === undefined && rts === undefined) return;
  port.set({ ...(dtr === undefined ? {} : { dtr }), ...(rts === undefined ? {} : { rts }) }, () => undefined);
}

class PortStream implements ByteStream {
  constructor(private readonly port: SerialPort) {}

  get isOpen(): boolean {
    return this.port.isOpen;
  }

  write(bytes: Buffer, taken: (error?: Error | null) => void): void {
    this.port.write(bytes, taken);
  }

  async close(): Promise<void> {
    if (!this.port.isOpen) return;
    await new Promise<void>((done) => this.port.close(() => done()));
  }
}
