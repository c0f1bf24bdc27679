import { realpath, stat } from 'node:fs/promises';
import { resolve } from 'node:path';
import { ReadlineParser } from '@serialport/parser-readline';
import { SerialPort } from 'serialport';
import { NotYetError } from '@/shared/lib/not-yet-error';
import type { ByteLine, ByteLineFactory, ByteLineHandlers } from '../interfaces/byte-line';
import type { Clock } from '../interfaces/clock';

export interface SerialSettings {
  path: string;
  baudRate: number;
  /** Levels of the control lines after opening; a port that has no such lines keeps silent about it. */
  dtr?: boolean;
  rts?: boolean;
}

/** A serial port that cannot be opened; the message says what was tried, what is wrong and what would be right. */
class LineError extends Error {
  constructor(
    readonly code: 'missing' | 'not-a-port' | 'locked' | 'no-permission' | 'failed',
    message: string,
  ) {
    super(message);
  }
}

const PSEUDO_TERMINALS = '/dev/pts/';
/** A write that the port has not taken by then never ends by itself. */
const WRITE_DEADLINE_MS = 1000;
/** More bytes than this without a line end do not come from a controller. */
const MOST_BYTES_WITHOUT_LINE = 4096;

/** @throws NotYetError unless the path leads to a pseudo-terminal; a path that does not exist yet passes if it could become one */
export async function assertPseudoTerminal(path: string): Promise<void> {
  const place = await realpath(path).catch(() => resolve(path));
  const elsewhere = place.startsWith('/dev/') || (await isThere(place));
  if (elsewhere && !place.startsWith(PSEUDO_TERMINALS)) {
    throw new NotYetError(
      `${path} is not a pseudo-terminal. This version opens pseudo-terminals and the simulated turntable only; real ports come with a later one.`,
    );
  }
}

const isThere = (path: string) =>
  stat(path).then(
    () => true,
    () => false,
  );

/** The line over a serial port. Each opening makes a fresh port object: an old one would send what was written while it was closed. */
export function serialFactory(settings: SerialSettings, clock: Clock): ByteLineFactory {
  return {
    description: settings.path,
    // A pseudo-terminal does not throttle to the rate: its bytes take no time of their own.
    byteTimeMs: 0,
    open: async (handlers) => {
      await assertPort(settings.path);
      await assertPseudoTerminal(settings.path);
      const port = new SerialPort({ path: settings.path, baudRate: settings.baudRate, autoOpen: false });
      await openPort(port, settings.path);
      setControlLines(port, settings);
      return new SerialLine(port, handlers, clock);
    },
  };
}

async function assertPort(path: string): Promise<void> {
  const found = await stat(path).catch(() => null);
  if (found === null)
    throw new LineError('missing', `There is no port ${path}. Plug the controller in, or choose the path under which it appears.`);
  if (found.isDirectory()) throw new LineError('not-a-port', `${path} is a folder, not a serial port. Choose the port's own path.`);
  if (!found.isCharacterDevice())
    throw new LineError('not-a-port', `${path} is a file, not a serial port. Choose the path of the controller's port.`);
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

class SerialLine implements ByteLine {
  private over = false;
  private bytesWithoutLine = 0;

  constructor(
    private readonly port: SerialPort,
    private readonly handlers: ByteLineHandlers,
    private readonly clock: Clock,
  ) {
    port.on('error', (error) => this.end(`the port reported an error: ${error.message}`));
    port.on('close', () => this.end('the port has disappeared'));
    port.on('data', (chunk: Buffer) => this.guard(chunk));
    const lines = port.pipe(new ReadlineParser({ delimiter: '\n', encoding: 'latin1' }));
    lines.on('data', (line: string) => {
      if (!this.over) this.handlers.onLine(line);
    });
  }

  write(bytes: string): void {
    // What is written to a closed port would be kept and sent when it opens again.
    if (this.over || !this.port.isOpen) return;
    const cancel = this.clock.after(WRITE_DEADLINE_MS, () => this.end(`the port took no bytes for ${WRITE_DEADLINE_MS / 1000} s`));
    this.port.write(bytes, 'latin1', (error) => {
      cancel();
      if (error !== null && error !== undefined) this.end(`writing failed: ${error.message}`);
    });
  }

  async close(): Promise<void> {
    this.over = true;
    if (!this.port.isOpen) return;
    await new Promise<void>((done) => this.port.close(() => done()));
  }

  private guard(chunk: Buffer): void {
    const end = chunk.lastIndexOf(0x0a);
    this.bytesWithoutLine = end < 0 ? this.bytesWithoutLine + chunk.length : chunk.length - end - 1;
    if (this.bytesWithoutLine > MOST_BYTES_WITHOUT_LINE)
      this.end('bytes without line ends come in: this is not a controller, or the rate is wrong');
  }

  private end(why: string): void {
    if (this.over) return;
    void this.close();
    this.handlers.onClosed(why);
  }
}
