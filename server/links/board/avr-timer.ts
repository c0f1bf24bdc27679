import type { AvrCore, AvrInterrupt, TimedPart, WriteHook } from './avr-core';
import type { TimerPlace } from './avr-timer-places';

/** A compare output changed at a cycle; level null when the pin is the port's again. */
type OnOutput = (output: { unit: 'a' | 'b'; level: boolean | null; cycle: number }) => void;

/** A compare unit, or the overflow. */
interface Unit {
  interrupt: AvrInterrupt;
  /** What happens at the pin at each match: 0 nothing, 1 toggled, 2 cleared, 3 set. */
  action: number;
  level: boolean;
  /** Register of the value; null for the overflow. */
  register: number | null;
}

const UNIT = { overflow: 0, a: 1, b: 2 } as const;
const FLAG = [0x01, 0x02, 0x04] as const;
const FORCE = [0, 0x80, 0x40] as const;

/**
 * A timer that is worked out only when something looks or something falls due: normal mode and clear on compare match, with
 * compare outputs. A flag is set, and a pin acts, on the timer tick after the one on which the count equals the compare value.
 */
export class AvrTimer implements TimedPart {
  dueCycle = Infinity;
  private divisor = 0;
  private top: number;
  private readonly max: number;
  /** The count at a tick of the prescaled clock. */
  private count = 0;
  private tick = 0;
  /** High byte on its way to or from a register of 16 bits (section 16.3). */
  private high = 0;
  private readonly units: readonly [Unit, Unit, Unit];

  constructor(
    private readonly core: AvrCore,
    private readonly place: TimerPlace,
    private readonly onOutput: OnOutput = () => undefined,
  ) {
    this.max = place.bits === 8 ? 0xff : 0xffff;
    this.top = this.max;
    const { vectors, compareA, compareB } = place;
    this.units = [this.unit(0, vectors.overflow, null), this.unit(1, vectors.a, compareA), this.unit(2, vectors.b, compareB)];
    core.add(this);
    this.hook();
  }

  reset(): void {
    this.divisor = 0;
    this.top = this.max;
    this.count = 0;
    this.tick = 0;
    for (const unit of this.units) Object.assign(unit, { action: 0, level: false });
    this.tellOutputs();
    this.schedule();
  }

  runDue(): void {
    this.sync(this.dueCycle);
    this.schedule();
  }

  state() {
    const { divisor, top, count, tick, high } = this;
    return { divisor, top, count, tick, high, units: this.units.map(({ action, level }) => ({ action, level })) };
  }

  restore({ units, ...rest }: ReturnType<AvrTimer['state']>): void {
    Object.assign(this, rest);
    units.forEach((unit, index) => Object.assign(this.units[index] as Unit, unit));
    this.tellOutputs();
    this.allowInterrupts(this.core.cpu.data[this.place.mask] as number);
    this.schedule();
  }

  private unit(index: 0 | 1 | 2, address: number, register: number | null): Unit {
    const { flags: flagRegister, mask: enableRegister } = this.place;
    const flagMask = FLAG[index];
    return { interrupt: { address, flagRegister, flagMask, enableRegister, enableMask: flagMask }, action: 0, level: false, register };
  }

  private hook(): void {
    const { cpu } = this.core;
    const { place } = this;
    const write = (address: number, take: (value: number) => void) => {
      cpu.writeHooks[address] = (value: number) => {
        this.sync(cpu.cycles);
        cpu.data[address] = value;
        take(value);
        this.schedule();
        return true;
      };
    };
    write(place.controlA, () => this.control());
    write(place.controlB, () => this.control());
    write(place.mask, (value) => this.allowInterrupts(value));
    this.hookForce();
    cpu.writeHooks[place.flags] = (value: number) => {
      this.sync(cpu.cycles);
      for (const { interrupt } of this.units) cpu.clearInterruptByFlag(interrupt, value);
      this.schedule();
      return true;
    };
    cpu.readHooks[place.flags] = (address: number) => {
      this.sync(cpu.cycles);
      return cpu.data[address] as number;
    };
    this.hookValue(place.count, (value) => (this.count = value));
    for (const address of [place.compareA, place.compareB, ...(place.capture === undefined ? [] : [place.capture])])
      this.hookValue(address, () => (this.top = this.topNow()));
    this.hookCount();
  }

  private hookForce(): void {
    const { cpu } = this.core;
    const { force } = this.place;
    const inner = cpu.writeHooks[force];
    cpu.writeHooks[force] = (...[value, ...rest]: Parameters<WriteHook>) => {
      inner?.(value & ~(FORCE[1] | FORCE[2]), ...rest);
      for (const index of [UNIT.a, UNIT.b]) if ((value & FORCE[index]) !== 0) this.act(this.units[index], cpu.cycles);
      return true;
    };
  }

  /** A register of the timer's width, taken when its low byte is written. */
  private hookValue(address: number, take: (value: number) => void): void {
    const { cpu } = this.core;
    const wide = this.place.bits === 16;
    cpu.writeHooks[address] = (value: number) => {
      this.sync(cpu.cycles);
      cpu.data[address] = value;
      if (wide) cpu.data[address + 1] = this.high;
      take(wide ? this.high * 256 + value : value);
      this.schedule();
      return true;
    };
    if (!wide) return;
    cpu.writeHooks[address + 1] = (value: number) => {
      this.high = value;
      return true;
    };
  }

  private hookCount(): void {
    const { cpu } = this.core;
    const { count } = this.place;
    cpu.readHooks[count] = () => {
      this.sync(cpu.cycles);
      this.high = this.count >> 8;
      return this.count & 0xff;
    };
    if (this.place.bits === 16) cpu.readHooks[count + 1] = () => this.high;
  }

  private control(): void {
    const { data } = this.core.cpu;
    const [a, b] = [data[this.place.controlA] as number, data[this.place.controlB] as number];
    const divisor = this.place.divisors[b & 7];
    if (divisor === undefined) throw new Error('a timer clocked from outside is not emulated');
    this.divisor = divisor;
    this.tick = divisor === 0 ? 0 : Math.floor(this.core.cycle / divisor);
    this.top = this.topNow();
    this.units[UNIT.a].action = a >> 6;
    this.units[UNIT.b].action = (a >> 4) & 3;
    this.tellOutputs();
  }

  private tellOutputs(): void {
    for (const [name, unit] of [
      ['a', this.units[UNIT.a]],
      ['b', this.units[UNIT.b]],
    ] as const)
      this.onOutput({ unit: name, level: unit.action === 0 ? null : unit.level, cycle: this.core.cycle });
  }

  private topNow(): number {
    const { data } = this.core.cpu;
    const { controlA, controlB, bits, compareA, capture } = this.place;
    const mode = ((data[controlA] as number) & 3) | (((data[controlB] as number) >> 1) & (bits === 8 ? 4 : 12));
    if (mode === 0) return this.max;
    if (mode === (bits === 8 ? 2 : 4)) return this.valueAt(compareA);
    if (mode === 12 && capture !== undefined) return this.valueAt(capture);
    throw new Error(`the waveform mode ${mode} of a timer is not emulated`);
  }

  private valueAt(register: number): number {
    const { data } = this.core.cpu;
    return (data[register] as number) + (this.place.bits === 16 ? 256 * (data[register + 1] as number) : 0);
  }

  private allowInterrupts(mask: number): void {
    for (const { interrupt } of this.units) this.core.cpu.updateInterruptEnable(interrupt, mask);
  }

  /** Ticks until the count leaves `value`, which is when its flag is set; Infinity when it never comes there. */
  private ticksToFlag(value: number): number {
    const { count, top, max } = this;
    const last = count <= top ? top : max;
    if (value >= count && value <= last) return value - count + 1;
    return value <= top ? last - count + 1 + value + 1 : Infinity;
  }

  private valueOf({ register }: Unit): number {
    return register === null ? this.max : this.valueAt(register);
  }

  /** Brings count, flags and outputs up to a cycle. */
  private sync(cycle: number): void {
    if (this.divisor === 0) return;
    const passed = Math.floor(cycle / this.divisor) - this.tick;
    if (passed <= 0) return;
    for (const unit of this.units) {
      const ticks = this.ticksToFlag(this.valueOf(unit));
      if (ticks <= passed) this.match(unit, (this.tick + ticks) * this.divisor);
    }
    const last = this.count <= this.top ? this.top : this.max;
    const ahead = this.count + passed;
    this.count = ahead <= last ? ahead : (ahead - last - 1) % (this.top + 1);
    this.tick += passed;
  }

  private match(unit: Unit, cycle: number): void {
    this.core.cpu.setInterruptFlag(unit.interrupt);
    this.act(unit, cycle);
  }

  private act(unit: Unit, cycle: number): void {
    if (unit.action === 0) return;
    const level = unit.action === 1 ? !unit.level : unit.action === 3;
    if (level === unit.level) return;
    unit.level = level;
    this.onOutput({ unit: unit === this.units[UNIT.a] ? 'a' : 'b', level, cycle });
  }

  private schedule(): void {
    let ticks = Infinity;
    const enabled = this.core.cpu.data[this.place.mask] as number;
    if (this.divisor !== 0)
      for (const unit of this.units)
        if ((enabled & unit.interrupt.enableMask) !== 0 || unit.action !== 0) ticks = Math.min(ticks, this.ticksToFlag(this.valueOf(unit)));
    this.dueCycle = ticks === Infinity ? Infinity : (this.tick + ticks) * this.divisor;
    this.core.reschedule();
  }
}
