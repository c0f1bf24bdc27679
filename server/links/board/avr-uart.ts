import { AvrCore, type TimedPart } from './avr-core';

/** The serial port (data sheet DS40002061, section 20): eight bits, asynchronous. */
const STATUS = 0xc0;
const CONTROL = 0xc1;
const RATE_LOW = 0xc4;
const RATE_HIGH = 0xc5;
const DATA = 0xc6;
const RECEIVED = 0x80;
const SENT = 0x40;
const EMPTY = 0x20;
const OVERRUN = 0x08;
const DOUBLE_SPEED = 0x02;
const RECEIVER_ON = 0x10;
const SENDER_ON = 0x08;
const BITS_PER_BYTE = 10;
/** Section 20.7.3: two bytes wait in the receiver's buffer, a third in its shift register until the next start bit. */
const BUFFERED = 2;

interface Arrival {
  atCycle: number;
  byte: number;
}

/** What comes in is there at the end of its character, what goes out likewise; both directions buffer as the chip does. */
export class AvrUart implements TimedPart {
  dueCycle = Infinity;
  private readonly arrivals: Arrival[] = [];
  private readonly buffer: number[] = [];
  private shifted: number | null = null;
  private sending: { byte: number; endCycle: number } | null = null;
  private waiting: number | null = null;
  private overrun = false;
  private readonly received = AvrCore.levelTriggered(interruptAt(0x24, RECEIVED));
  private readonly empty = AvrCore.levelTriggered(interruptAt(0x26, EMPTY));
  private readonly sent = interruptAt(0x28, SENT);

  /** `onByte`: a byte has left at this cycle, the end of its character. */
  constructor(
    private readonly core: AvrCore,
    private readonly onByte: (byte: number, cycle: number) => void,
  ) {
    core.add(this);
    this.hook();
  }

  reset(): void {
    this.core.cpu.data[STATUS] = EMPTY;
    this.buffer.length = 0;
    this.shifted = null;
    this.sending = null;
    this.waiting = null;
    this.overrun = false;
    this.schedule();
  }

  /** Whether a character is on its way out. */
  get busy(): boolean {
    return this.sending !== null;
  }

  /** A byte on the wire whose character ends at `atCycle`; in the order of their ends. */
  receive(byte: number, atCycle: number): void {
    this.arrivals.push({ atCycle, byte });
    this.schedule();
  }

  runDue(): void {
    const { cycle } = this.core;
    while (this.arrivals[0] !== undefined && this.arrivals[0].atCycle <= cycle) this.arrive(this.arrivals.shift() as Arrival);
    while (this.sending !== null && this.sending.endCycle <= cycle) this.depart(this.sending);
    this.schedule();
  }

  state() {
    const { arrivals, buffer, shifted, sending, waiting, overrun } = this;
    return { arrivals: [...arrivals], buffer: [...buffer], shifted, sending, waiting, overrun };
  }

  restore({ arrivals, buffer, ...rest }: ReturnType<AvrUart['state']>): void {
    Object.assign(this, rest);
    this.arrivals.splice(0, Infinity, ...arrivals);
    this.buffer.splice(0, Infinity, ...buffer);
    this.allowInterrupts(this.core.cpu.data[CONTROL] as number);
    this.schedule();
  }

  private hook(): void {
    const { cpu } = this.core;
    cpu.writeHooks[STATUS] = (value: number) => {
      cpu.data[STATUS] = ((cpu.data[STATUS] as number) & ~DOUBLE_SPEED) | (value & DOUBLE_SPEED);
      cpu.clearInterruptByFlag(this.sent, value);
      return true;
    };
    cpu.readHooks[STATUS] = () => (cpu.data[STATUS] as number) | (this.overrun ? OVERRUN : 0);
    cpu.writeHooks[CONTROL] = (value: number) => {
      cpu.data[CONTROL] = value;
      if ((value & RECEIVER_ON) === 0) this.flush();
      this.allowInterrupts(value);
      return true;
    };
    cpu.readHooks[DATA] = () => this.take();
    cpu.writeHooks[DATA] = (value: number) => {
      if (((cpu.data[CONTROL] as number) & SENDER_ON) !== 0) this.put(value);
      return true;
    };
  }

  private allowInterrupts(control: number): void {
    for (const interrupt of [this.received, this.empty, this.sent]) this.core.cpu.updateInterruptEnable(interrupt, control);
  }

  private flush(): void {
    this.buffer.length = 0;
    this.shifted = null;
    this.core.cpu.clearInterrupt(this.received);
  }

  private arrive({ byte }: Arrival): void {
    if (((this.core.cpu.data[CONTROL] as number) & RECEIVER_ON) === 0) return;
    if (this.shifted !== null) this.overrun = true;
    if (this.buffer.length >= BUFFERED) this.shifted = byte;
    else this.buffer.push(byte);
    this.core.cpu.setInterruptFlag(this.received);
  }

  private take(): number {
    const byte = this.buffer.shift() ?? 0;
    this.overrun = false;
    if (this.shifted !== null) this.buffer.push(this.shifted);
    this.shifted = null;
    if (this.buffer.length === 0) this.core.cpu.clearInterrupt(this.received);
    return byte;
  }

  private put(byte: number): void {
    const { cpu } = this.core;
    if (this.sending === null) this.begin(byte, cpu.cycles);
    else if (this.waiting === null) {
      this.waiting = byte;
      cpu.clearInterrupt(this.empty);
    }
    this.schedule();
  }

  private begin(byte: number, atCycle: number): void {
    this.sending = { byte, endCycle: atCycle + this.cyclesPerByte() };
  }

  private depart({ byte, endCycle }: { byte: number; endCycle: number }): void {
    const { cpu } = this.core;
    const { waiting } = this;
    this.waiting = null;
    this.sending = null;
    if (waiting === null) cpu.setInterruptFlag(this.sent);
    else {
      this.begin(waiting, endCycle);
      cpu.setInterruptFlag(this.empty);
    }
    this.onByte(byte, endCycle);
  }

  private cyclesPerByte(): number {
    const { data } = this.core.cpu;
    const divisor = ((data[RATE_HIGH] as number) & 0x0f) * 256 + (data[RATE_LOW] as number) + 1;
    return BITS_PER_BYTE * divisor * (((data[STATUS] as number) & DOUBLE_SPEED) !== 0 ? 8 : 16);
  }

  private schedule(): void {
    this.dueCycle = Math.min(this.arrivals[0]?.atCycle ?? Infinity, this.sending?.endCycle ?? Infinity);
    this.core.reschedule();
  }
}

function interruptAt(address: number, flag: number) {
  return { address, flagRegister: STATUS, flagMask: flag, enableRegister: CONTROL, enableMask: flag };
}
