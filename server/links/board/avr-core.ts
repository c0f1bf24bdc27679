import { avrInstruction, CPU } from 'avr8js';

/**
 * The processor: avr8js carries the instructions out; what surrounds them is here, because its own loop, timers and serial port
 * are too slow or not right. Numbers of sections are those of the ATmega328P data sheet (DS40002061).
 */

export const CPU_HZ = 16_000_000;
export const CYCLES_PER_US = CPU_HZ / 1_000_000;

const RAM_BYTES = 2048;
const FIRST_IO = 0x20;
const FIRST_RAM = 0x100;
const SREG = 0x5f;
const INTERRUPTS_ON = 0x80;
const SMCR = 0x53;
const SLEEP_ENABLED = 0x01;
const SLEEP_MODE = 0x0e;
const SLEEP = 0x9588;
const SEI = 0x9478;
const RETI = 0x9518;
/** Section 7.7.1: four cycles into an interrupt, of which avr8js counts two; four more out of sleep. */
const MORE_CYCLES_IN = 2;
const CYCLES_TO_WAKE = 4;

/** Vector (in words), flag and mask of an interrupt. */
export type AvrInterrupt = Parameters<CPU['setInterruptFlag']>[0];

/** What is called when a register is written: value, value before, address, mask of the bits that are meant. */
export type WriteHook = CPU['writeHooks'][number];

/** A part of the chip that does something of its own accord at a cycle known beforehand. */
export interface TimedPart {
  /** Infinity: nothing is to come. */
  dueCycle: number;
  /** Called at or just after `dueCycle`. */
  runDue(): void;
}

export class AvrCore {
  readonly cpu: CPU;
  private readonly parts: TimedPart[] = [];
  private nextDue = Infinity;
  asleep = false;

  constructor(program: Uint8Array) {
    this.cpu = new CPU(new Uint16Array(program.buffer, program.byteOffset, program.byteLength / 2), RAM_BYTES);
  }

  get cycle(): number {
    return this.cpu.cycles;
  }

  add(part: TimedPart): void {
    this.parts.push(part);
  }

  /** After a part's `dueCycle` changed. */
  reschedule(): void {
    let next = Infinity;
    for (const part of this.parts) if (part.dueCycle < next) next = part.dueCycle;
    this.nextDue = next;
  }

  /** Registers as after a reset (section 11); memory keeps what it holds. */
  reset(): void {
    this.cpu.data.fill(0, FIRST_IO, FIRST_RAM);
    this.cpu.reset();
    this.asleep = false;
  }

  state() {
    const { data, pc, cycles } = this.cpu;
    return { data: data.slice(), pc, cycles, asleep: this.asleep };
  }

  /** Requests of interrupts are raised again by the parts, out of their flags. */
  restore({ data, pc, cycles, asleep }: ReturnType<AvrCore['state']>): void {
    this.cpu.reset();
    this.cpu.data.set(data);
    Object.assign(this.cpu, { pc, cycles });
    this.asleep = asleep;
  }

  /** Runs until the cycle is reached; an instruction that began before it is finished. */
  runTo(cycle: number): void {
    const { cpu } = this;
    const { progMem, data } = cpu;
    while (cpu.cycles < cycle) {
      if (this.asleep) {
        if (this.sleepTo(cycle)) continue;
        cpu.cycles += CYCLES_TO_WAKE;
        this.interrupt();
        continue;
      }
      const opcode = progMem[cpu.pc];
      avrInstruction(cpu);
      if (cpu.cycles >= this.nextDue) this.runParts();
      if (opcode === SLEEP) this.fallAsleep();
      // Sections 7.7 and 7.3.1: the instruction after SEI and RETI is carried out before any interrupt.
      else if (cpu.nextInterrupt >= 0 && ((data[SREG] as number) & INTERRUPTS_ON) !== 0 && opcode !== SEI && opcode !== RETI)
        this.interrupt();
    }
  }

  /** Registers an interrupt whose request stays for as long as its flag does. */
  static levelTriggered(interrupt: Omit<AvrInterrupt, 'constant'>): AvrInterrupt {
    return { ...interrupt, constant: true };
  }

  private fallAsleep(): void {
    const mode = this.cpu.data[SMCR] as number;
    if ((mode & SLEEP_ENABLED) === 0) return;
    if ((mode & SLEEP_MODE) !== 0) throw new Error('only the idle mode of sleep is emulated');
    this.asleep = true;
  }

  /** True while it goes on sleeping; time jumps to what comes next. */
  private sleepTo(cycle: number): boolean {
    const { cpu } = this;
    if (cpu.nextInterrupt >= 0 && cpu.interruptsEnabled) {
      this.asleep = false;
      return false;
    }
    cpu.cycles = Math.max(cpu.cycles, Math.min(this.nextDue, cycle));
    if (cpu.cycles >= this.nextDue) this.runParts();
    return true;
  }

  private interrupt(): void {
    this.cpu.tick();
    this.cpu.cycles += MORE_CYCLES_IN;
  }

  private runParts(): void {
    const { cycles } = this.cpu;
    for (const part of this.parts) if (part.dueCycle <= cycles) part.runDue();
    this.reschedule();
  }
}
