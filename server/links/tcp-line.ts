import { connect, type Socket } from 'node:net';
import type { ByteLine, ByteLineFactory, ByteLineHandlers } from '../interfaces/byte-line';
import type { Clock } from '../interfaces/clock';
import { LineError } from './line-error';
import { StreamLine, type ByteStream } from './stream-line';
import { ComPortAgreement, escaped, TelnetReader } from './telnet';

export interface TcpSettings {
  host: string;
  port: number;
  /** `raw`: bytes as they are; `rfc2217`: Telnet with the COM port option, which sets the rate at the other end. */
  mode: 'raw' | 'rfc2217';
  /** Of the serial port at the other end. */
  baudRate: number;
  dtr?: boolean | undefined;
  rts?: boolean | undefined;
}

const BITS_PER_BYTE = 10;
const CONNECT_DEADLINE_MS = 5_000;
const AGREEMENT_DEADLINE_MS = 3_000;
const KEEP_ALIVE_MS = 2_000;
/** A server that cannot open its own port says so and hangs up within a moment of the connection (an estimate, no source). */
const MOMENT_MS = 100;
/** Of what came last, so many bytes are kept for the words that a serial server says before it hangs up. */
const KEPT_BYTES = 200;

/**
 * The line over a network serial server. A connection is no controller yet: a server accepts it before it opens its own port,
 * so the link is ready only when the controller has answered. Any address may be given, private and loopback ones too: that is where
 * such servers are. Nothing but the controller's protocol is spoken there, and of what comes back nothing is passed on but
 * the controller's lines.
 */
export function tcpFactory(settings: TcpSettings, clock: Clock): ByteLineFactory {
  const description = `${settings.host.includes(':') ? `[${settings.host}]` : settings.host}:${settings.port}`;
  return {
    description,
    byteTimeMs: (BITS_PER_BYTE * 1000) / settings.baudRate,
    open: async (handlers) => {
      const socket = await connected(settings, description, clock);
      const talk = new TcpTalk({ settings, description, clock, socket, handlers });
      return talk.opened();
    },
  };
}

function connected({ host, port }: TcpSettings, description: string, clock: Clock): Promise<Socket> {
  return new Promise((done, failed) => {
    const socket = connect({ host, port, noDelay: true, keepAlive: true, keepAliveInitialDelay: KEEP_ALIVE_MS });
    const cancel = clock.after(CONNECT_DEADLINE_MS, () => {
      socket.destroy();
      failed(
        new LineError(
          'unreachable',
          `${description} does not answer within ${CONNECT_DEADLINE_MS / 1000} s. Check the address and the network.`,
        ),
      );
    });
    socket.once('connect', () => {
      cancel();
      socket.removeAllListeners('error');
      done(socket);
    });
    socket.once('error', (error: NodeJS.ErrnoException) => {
      cancel();
      failed(connectError(host, description, error));
    });
  });
}

function connectError(host: string, description: string, error: NodeJS.ErrnoException): LineError {
  switch (error.code) {
    case 'ENOTFOUND':
    case 'EAI_AGAIN':
      return new LineError('unreachable', `There is no address for the name ${host}. Check the name, or give the address itself.`);
    case 'ECONNREFUSED':
      return new LineError('unreachable', `Nothing listens at ${description}. Start the serial server there, or check the port number.`);
    default:
      return new LineError(
        'unreachable',
        `${description} cannot be reached (${error.code ?? error.message}). Check the address and the network.`,
      );
  }
}

interface TalkParts {
  settings: TcpSettings;
  description: string;
  clock: Clock;
  socket: Socket;
  handlers: ByteLineHandlers;
}

/** One connection to a serial server. */
class TcpTalk {
  readonly line: StreamLine;
  private readonly reader = new TelnetReader();
  private readonly agreement: ComPortAgreement;
  private last = '';
  private settle: (error?: LineError) => void = () => undefined;

  constructor(private readonly parts: TalkParts) {
    const { settings, socket, handlers, clock } = parts;
    this.agreement = new ComPortAgreement(settings);
    const stream = new SocketStream(socket, settings.mode === 'rfc2217');
    this.line = new StreamLine({ stream, handlers, clock, name: 'the serial server' });
    socket.on('data', (chunk: Buffer) => this.take(chunk));
    socket.on('error', (error) => this.end(`the connection to ${parts.description} broke: ${error.message}`));
    socket.on('close', () => this.end(this.farewell()));
  }

  /** Resolves when the server has acknowledged the rate and the form of the bytes or, raw, has not hung up at once. */
  opened(): Promise<ByteLine> {
    const { clock, socket, settings } = this.parts;
    const isRaw = settings.mode === 'raw';
    return new Promise((done, failed) => {
      const cancel = clock.after(isRaw ? MOMENT_MS : AGREEMENT_DEADLINE_MS, () =>
        this.settle(isRaw ? undefined : this.unusable('it does not answer as RFC 2217 asks for; choose raw, or switch RFC 2217 on there')),
      );
      this.settle = (error) => {
        cancel();
        this.settle = () => undefined;
        if (error === undefined) return done(this.line);
        void this.line.close();
        failed(error);
      };
      if (!isRaw) socket.write(this.agreement.opening());
    });
  }

  private unusable(why: string): LineError {
    return new LineError('other-mode', `The serial server at ${this.parts.description} cannot be used: ${why}.`);
  }

  private take(chunk: Buffer): void {
    if (this.parts.settings.mode === 'raw') return this.pass(chunk);
    const { data, commands } = this.reader.take(chunk);
    try {
      for (const command of commands) {
        const answer = this.agreement.hear(command);
        if (answer.length > 0) this.parts.socket.write(answer);
      }
      if (this.agreement.isComplete) this.settle();
    } catch (error) {
      const { message } = this.unusable((error as Error).message);
      this.settle(new LineError('other-mode', message));
      this.line.end(message);
    }
    if (data.length > 0) this.pass(data);
  }

  private pass(data: Buffer): void {
    this.last = (this.last + data.toString('latin1')).slice(-KEPT_BYTES);
    // The server's own words before it hangs up are no line of a controller.
    if (farewellOf(this.last) === null) this.line.take(data);
  }

  private end(why: string): void {
    this.settle(new LineError('unreachable', why));
    this.line.end(why);
  }

  /** What the server said before it hung up, in clear words. */
  private farewell(): string {
    const { description } = this.parts;
    const farewell = farewellOf(this.last);
    if (farewell === 'in-use')
      return `The serial port behind ${description} is in use by another connection. End that one, then this one opens by itself.`;
    if (farewell === 'no-device')
      return `The serial server at ${description} cannot open its port. Check that the controller is plugged in there.`;
    return `${description} closed the connection.`;
  }
}

/** The texts of Debian's ser2net 4.3. */
function farewellOf(last: string): 'in-use' | 'no-device' | null {
  if (/^\s*port.*already in use/im.test(last)) return 'in-use';
  return /^\s*device open failure/im.test(last) ? 'no-device' : null;
}

class SocketStream implements ByteStream {
  constructor(
    private readonly socket: Socket,
    private readonly escapes: boolean,
  ) {}

  get isOpen(): boolean {
    return this.socket.writable;
  }

  write(bytes: Buffer, taken: (error?: Error | null) => void): void {
    // A socket that cannot write closes, and its closing says why in better words.
    this.socket.write(this.escapes ? escaped(bytes) : bytes, () => taken());
  }

  async close(): Promise<void> {
    this.socket.destroy();
  }
}
