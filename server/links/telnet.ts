/**
 * The part of Telnet that a serial port over the network needs: escaping and options (RFC 854, RFC 855) and the COM port
 * option (RFC 2217). Pure: bytes in, bytes and commands out.
 */
export const IAC = 0xff;
const SE = 240;
const SB = 250;
const WILL = 251;
const WONT = 252;
const DO = 253;
const DONT = 254;
/** RFC 856: eight-bit bytes. */
const BINARY = 0;
/** RFC 858: no "go ahead". */
const SUPPRESS_GO_AHEAD = 3;
/** RFC 2217, section 2. */
const COM_PORT = 44;
const BAUD_RATE = 1;
const DATA_SIZE = 2;
const PARITY = 3;
const STOP_SIZE = 4;
const CONTROL = 5;
/** The server's answers carry the command's code plus 100 (RFC 2217, section 3). */
const ANSWER = 100;

const EIGHT_BITS = 8;
const NO_PARITY = 1;
const ONE_STOP_BIT = 1;
const DTR_ON = 8;
const DTR_OFF = 9;
const RTS_ON = 11;
const RTS_OFF = 12;

export type TelnetCommand =
  { kind: 'option'; verb: 'will' | 'wont' | 'do' | 'dont'; option: number } | { kind: 'answer'; to: number; value: number };

const VERBS: Record<number, 'will' | 'wont' | 'do' | 'dont'> = { [WILL]: 'will', [WONT]: 'wont', [DO]: 'do', [DONT]: 'dont' };
/** A suboption that grows past this is none of ours. */
const MOST_SUBOPTION_BYTES = 64;

/** Doubles the byte that Telnet uses for itself. */
export function escaped(bytes: Buffer): Buffer {
  return bytes.includes(IAC) ? Buffer.from([...bytes].flatMap((byte) => (byte === IAC ? [IAC, IAC] : [byte]))) : bytes;
}

/** Takes commands out of a stream of bytes, however it is cut. */
export class TelnetReader {
  private state: 'data' | 'iac' | 'verb' | 'sub' | 'sub-iac' = 'data';
  private verb = 0;
  private sub: number[] = [];

  take(chunk: Buffer): { data: Buffer; commands: TelnetCommand[] } {
    const data: number[] = [];
    const commands: TelnetCommand[] = [];
    for (const byte of chunk) this.step(byte, data, commands);
    return { data: Buffer.from(data), commands };
  }

  private step(byte: number, data: number[], commands: TelnetCommand[]): void {
    switch (this.state) {
      case 'data':
        if (byte === IAC) this.state = 'iac';
        else data.push(byte);
        return;
      case 'iac':
        return this.afterIac(byte, data);
      case 'verb':
        this.state = 'data';
        commands.push({ kind: 'option', verb: VERBS[this.verb] as 'will', option: byte });
        return;
      case 'sub':
        if (byte === IAC) this.state = 'sub-iac';
        else this.keep(byte);
        return;
      case 'sub-iac':
        if (byte === IAC) {
          this.state = 'sub';
          return this.keep(byte);
        }
        this.state = 'data';
        this.endSub(commands);
    }
  }

  private afterIac(byte: number, data: number[]): void {
    this.state = 'data';
    if (byte === IAC) data.push(byte);
    else if (byte in VERBS) {
      this.verb = byte;
      this.state = 'verb';
    } else if (byte === SB) {
      this.sub = [];
      this.state = 'sub';
    }
  }

  private keep(byte: number): void {
    if (this.sub.length < MOST_SUBOPTION_BYTES) this.sub.push(byte);
  }

  private endSub(commands: TelnetCommand[]): void {
    const [option, code, ...value] = this.sub;
    if (option !== COM_PORT || code === undefined || code < ANSWER) return;
    commands.push({ kind: 'answer', to: code - ANSWER, value: value.reduce((sum, byte) => sum * 256 + byte, 0) });
  }
}

const option = (verb: number, code: number) => Buffer.from([IAC, verb, code]);

function setting(code: number, value: number[]): Buffer {
  return Buffer.concat([Buffer.from([IAC, SB, COM_PORT, code]), escaped(Buffer.from(value)), Buffer.from([IAC, SE])]);
}

export interface ComPort {
  baudRate: number;
  dtr?: boolean | undefined;
  rts?: boolean | undefined;
}

/** Agrees with a serial server on 8 data bits, no parity, 1 stop bit and the rate, and knows when everything is acknowledged. */
export class ComPortAgreement {
  /** The server accepts the option, or has refused it. */
  private accepted = false;
  /** Command → the value that its answer must carry. */
  private readonly awaited: Map<number, number>;

  constructor(private readonly port: ComPort) {
    this.awaited = new Map([
      [BAUD_RATE, port.baudRate],
      [DATA_SIZE, EIGHT_BITS],
      [PARITY, NO_PARITY],
      [STOP_SIZE, ONE_STOP_BIT],
    ]);
  }

  /** What to send first of all. */
  opening(): Buffer {
    return Buffer.concat([option(WILL, COM_PORT), option(WILL, BINARY), option(DO, BINARY), option(DO, SUPPRESS_GO_AHEAD)]);
  }

  get isComplete(): boolean {
    return this.accepted && this.awaited.size === 0;
  }

  /** What follows from a command: bytes to send. @throws Error in words when the server cannot do what is needed */
  hear(command: TelnetCommand): Buffer {
    return command.kind === 'answer' ? this.hearAnswer(command) : this.hearOption(command);
  }

  private hearAnswer({ to, value }: { to: number; value: number }): Buffer {
    const wanted = this.awaited.get(to);
    if (wanted !== undefined && value !== wanted)
      throw new Error(
        to === BAUD_RATE
          ? `it sets ${value} Bd instead of ${wanted}; set its port to ${wanted} Bd`
          : 'it does not set 8 data bits, no parity and 1 stop bit; set its port so',
      );
    this.awaited.delete(to);
    return Buffer.alloc(0);
  }

  private hearOption({ verb, option: code }: { verb: string; option: number }): Buffer {
    if (code === COM_PORT) {
      if (verb === 'dont') throw new Error('it does not know RFC 2217; choose raw, or switch RFC 2217 on there');
      if (verb !== 'do' || this.accepted) return Buffer.alloc(0);
      this.accepted = true;
      return this.settings();
    }
    if (code === BINARY || code === SUPPRESS_GO_AHEAD) return Buffer.alloc(0);
    // Whatever else it offers or asks for is declined (RFC 855).
    if (verb === 'will') return option(DONT, code);
    return verb === 'do' ? option(WONT, code) : Buffer.alloc(0);
  }

  private settings(): Buffer {
    const { baudRate, dtr, rts } = this.port;
    const rate = Buffer.alloc(4);
    rate.writeUInt32BE(baudRate);
    // Not every server answers about control lines (a pseudo-terminal has none): they are set and not awaited.
    return Buffer.concat([
      setting(BAUD_RATE, [...rate]),
      setting(DATA_SIZE, [EIGHT_BITS]),
      setting(PARITY, [NO_PARITY]),
      setting(STOP_SIZE, [ONE_STOP_BIT]),
      ...(dtr === undefined ? [] : [setting(CONTROL, [dtr ? DTR_ON : DTR_OFF])]),
      ...(rts === undefined ? [] : [setting(CONTROL, [rts ? RTS_ON : RTS_OFF])]),
    ]);
  }
}
