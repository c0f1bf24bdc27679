import { ReadlineParser } from '@serialport/parser-readline';
import type { ByteLine, ByteLineHandlers } from '../interfaces/byte-line';
import type { Clock } from '../interfaces/clock';

/** What a line of bytes runs over: a serial port or a socket. */
export interface ByteStream {
  readonly isOpen: boolean;
  /** Calls back when the bytes were taken, or could not be. */
  write(bytes: Buffer, taken: (error?: Error | null) => void): void;
  close(): Promise<void>;
}

/** A write that the stream has not taken by then never ends by itself. */
const WRITE_DEADLINE_MS = 1000;
/** More bytes than this without a line end do not come from a controller. */
const MOST_BYTES_WITHOUT_LINE = 4096;

export interface StreamLineParts {
  stream: ByteStream;
  handlers: ByteLineHandlers;
  clock: Clock;
  /** What the stream is called in messages: "the port". */
  name: string;
  /** What is to be said of this line although it works. */
  remark?: string;
}

/** Lines over a stream of bytes: cut at line feeds however they arrive, with a deadline for every write. */
export class StreamLine implements ByteLine {
  readonly remark: string | undefined;
  private over = false;
  private bytesWithoutLine = 0;
  private readonly lines = new ReadlineParser({ delimiter: '\n', encoding: 'latin1' });

  constructor(private readonly parts: StreamLineParts) {
    this.remark = parts.remark;
    this.lines.on('data', (line: string) => {
      if (!this.over) parts.handlers.onLine(line);
    });
  }

  /** Bytes that came in. */
  take(chunk: Buffer): void {
    if (this.over) return;
    this.lines.write(chunk);
    const end = chunk.lastIndexOf(0x0a);
    this.bytesWithoutLine = end < 0 ? this.bytesWithoutLine + chunk.length : chunk.length - end - 1;
    if (this.bytesWithoutLine > MOST_BYTES_WITHOUT_LINE)
      this.end('bytes without line ends come in: this is not a controller, or the rate is wrong');
  }

  write(bytes: string): void {
    const { stream, clock, name } = this.parts;
    // What is written to a closed port would be kept and sent when it opens again.
    if (this.over || !stream.isOpen) return;
    const cancel = clock.after(WRITE_DEADLINE_MS, () => this.end(`${name} took no bytes for ${WRITE_DEADLINE_MS / 1000} s`));
    stream.write(Buffer.from(bytes, 'latin1'), (error) => {
      cancel();
      if (error !== null && error !== undefined) this.end(`writing failed: ${error.message}`);
    });
  }

  async close(): Promise<void> {
    this.over = true;
    await this.parts.stream.close();
  }

  /** The stream is of no use any more. */
  end(why: string): void {
    if (this.over) return;
    void this.close();
    this.parts.handlers.onClosed(why);
  }
}
