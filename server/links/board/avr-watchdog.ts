import { CPU_HZ, type AvrCore, type TimedPart } from './avr-core';

/** Data sheet DS40002061, section 11.8 and 11.9. */
const CONTROL = 0x60;
const STATUS = 0x54;
const FLAG = 0x80;
const INTERRUPT = 0x40;
const RESET = 0x08;
const CAUSE_WATCHDOG = 0x08;
/** 2048 cycles of the watchdog's own 128 kHz, doubled with each step of the prescaler. */
const SHORTEST_CYCLES = (2048 / 128_000) * CPU_HZ;

/** Restarts the chip when the program does not say in time that it is alive. The timed sequence of changes is not demanded. */
export class AvrWatchdog implements TimedPart {
  dueCycle = Infinity;
  private fedCycle = 0;
  private readonly interrupt = {
    address: 0x0c,
    flagRegister: CONTROL,
    flagMask: FLAG,
    enableRegister: CONTROL,
    enableMask: INTERRUPT,
  };

  constructor(
    private readonly core: AvrCore,
    private readonly onReset: () => void,
  ) {
    core.add(this);
    core.cpu.onWatchdogReset = () => this.feed();
    core.cpu.writeHooks[CONTROL] = (value: number) => {
      const { data } = core.cpu;
      // After a reset by the watchdog it stays on until the cause is cleared.
      const held = (data[STATUS] as number) & CAUSE_WATCHDOG ? RESET : 0;
      data[CONTROL] = (value & ~FLAG & ~0x10) | held;
      core.cpu.updateInterruptEnable(this.interrupt, value);
      this.feed();
      return true;
    };
  }

  reset(byWatchdog: boolean): void {
    this.core.cpu.data[CONTROL] = byWatchdog ? RESET : 0;
    this.feed();
  }

  runDue(): void {
    const { cpu } = this.core;
    const control = cpu.data[CONTROL] as number;
    if ((control & INTERRUPT) !== 0) {
      cpu.setInterruptFlag(this.interrupt);
      if ((control & RESET) !== 0) cpu.data[CONTROL] = control & ~INTERRUPT;
      this.feed();
    } else this.onReset();
  }

  state() {
    return { fedCycle: this.fedCycle };
  }

  restore({ fedCycle }: ReturnType<AvrWatchdog['state']>): void {
    this.fedCycle = fedCycle;
    this.schedule();
  }

  private feed(): void {
    this.fedCycle = this.core.cycle;
    this.schedule();
  }

  private schedule(): void {
    const control = this.core.cpu.data[CONTROL] as number;
    const step = (control & 7) | ((control >> 2) & 8);
    this.dueCycle = (control & (INTERRUPT | RESET)) === 0 ? Infinity : this.fedCycle + SHORTEST_CYCLES * 2 ** step;
    this.core.reschedule();
  }
}
