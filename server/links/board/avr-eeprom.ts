import { AvrCore, CYCLES_PER_US, type TimedPart } from './avr-core';

/** Data sheet DS40002061, section 8.4 and 8.6. */
export const EEPROM_BYTES = 1024;
const CONTROL = 0x3f;
const DATA = 0x40;
const ADDRESS_LOW = 0x41;
const ADDRESS_HIGH = 0x42;
const READ = 0x01;
const WRITE = 0x02;
const MASTER_WRITE = 0x04;
const READY_INTERRUPT = 0x08;
const MODE = 0x30;
const ERASE_ONLY = 0x10;
const WRITE_ONLY = 0x20;
/** Table 8-1: both, or one of the two. */
const WHOLE_US = 3400;
const HALF_US = 1800;
/** The processor stands still while a byte is read or a write begins. */
const READ_CYCLES = 4;
const WRITE_CYCLES = 2;
const ERASED = 0xff;

interface Writing {
  address: number;
  byte: number;
  doneCycle: number;
}

/** Memory that outlives power. A write that a loss of power interrupts leaves its byte erased. */
export class AvrEeprom implements TimedPart {
  dueCycle = Infinity;
  private writing: Writing | null = null;
  /** Bytes written since the beginning: what wears out. */
  writes = 0;
  private readonly ready = AvrCore.levelTriggered({
    address: 0x2c,
    flagRegister: CONTROL,
    flagMask: WRITE,
    enableRegister: CONTROL,
    enableMask: READY_INTERRUPT,
    inverseFlag: true,
  });

  constructor(
    private readonly core: AvrCore,
    readonly cells: Uint8Array,
  ) {
    core.add(this);
    core.cpu.writeHooks[CONTROL] = (value: number) => {
      this.control(value);
      return true;
    };
  }

  /** The chip restarts; `powerLost`: in the middle of what it wrote. */
  reset(powerLost: boolean): void {
    if (this.writing !== null) this.cells[this.writing.address] = powerLost ? ERASED : this.writing.byte;
    this.writing = null;
    this.schedule();
  }

  runDue(): void {
    const { writing } = this;
    if (writing === null) return;
    this.cells[writing.address] = writing.byte;
    this.writing = null;
    const { cpu } = this.core;
    cpu.data[CONTROL] = (cpu.data[CONTROL] as number) & ~WRITE;
    this.tellReady();
    this.schedule();
  }

  state() {
    return { cells: this.cells.slice(), writing: this.writing, writes: this.writes };
  }

  restore({ cells, writing, writes }: ReturnType<AvrEeprom['state']>): void {
    this.cells.set(cells);
    this.writing = writing;
    this.writes = writes;
    this.tellReady();
    this.schedule();
  }

  private control(value: number): void {
    const { cpu } = this.core;
    const before = cpu.data[CONTROL] as number;
    const busy = this.writing !== null;
    const begins = (value & WRITE) !== 0 && (before & MASTER_WRITE) !== 0 && !busy;
    const kept = (value & (MODE | READY_INTERRUPT | MASTER_WRITE)) | (busy || begins ? WRITE : 0);
    cpu.data[CONTROL] = begins ? kept & ~MASTER_WRITE : kept;
    if (begins) this.begin(value & MODE);
    else if ((value & READ) !== 0 && !busy) {
      cpu.data[DATA] = this.cells[this.address()] as number;
      cpu.cycles += READ_CYCLES;
    }
    this.tellReady();
  }

  private tellReady(): void {
    const { cpu } = this.core;
    if (this.writing === null) cpu.updateInterruptEnable(this.ready, cpu.data[CONTROL] as number);
    else cpu.clearInterrupt(this.ready, false);
  }

  private begin(mode: number): void {
    const address = this.address();
    const old = this.cells[address] as number;
    const given = this.core.cpu.data[DATA] as number;
    // Writing alone can only clear bits.
    const byte = mode === ERASE_ONLY ? ERASED : mode === WRITE_ONLY ? old & given : given;
    this.writing = { address, byte, doneCycle: this.core.cycle + (mode === 0 ? WHOLE_US : HALF_US) * CYCLES_PER_US };
    this.writes += 1;
    this.core.cpu.cycles += WRITE_CYCLES;
    this.schedule();
  }

  private address(): number {
    const { data } = this.core.cpu;
    return ((data[ADDRESS_LOW] as number) + 256 * (data[ADDRESS_HIGH] as number)) % EEPROM_BYTES;
  }

  private schedule(): void {
    this.dueCycle = this.writing?.doneCycle ?? Infinity;
    this.core.reschedule();
  }
}
