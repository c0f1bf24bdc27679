import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import type { BootCause } from '@/firmware-protocol/codec';
import { AvrCore, CPU_HZ } from './avr-core';
import { AvrEeprom, EEPROM_BYTES } from './avr-eeprom';
import { AvrPorts, type PortName } from './avr-ports';
import { AvrTimer } from './avr-timer';
import { TIMERS } from './avr-timer-places';
import { AvrUart } from './avr-uart';
import { AvrWatchdog } from './avr-watchdog';
import { Turntable } from './turntable';

export interface BoardOptions {
  /** Program memory. */
  program: Uint8Array;
  /** What the EEPROM holds; default: erased. */
  eeprom?: Uint8Array;
  /** Where the table stands, microsteps from the home edge; default 0. */
  startSteps?: number;
  /** Play between motor and table, microsteps; default 0. */
  backlashSteps?: number;
  /** Microsteps of a turn of a table that may make whole turns: its flag covers the half turn below the edge. Absent: all below it. */
  turnSteps?: number;
  /** Of what the memory holds after power-on; default 1. */
  seed?: number;
  /** Rate of the bytes that arrive, bit/s; default 115200. */
  hostBaud?: number;
}

export type BoardInput = 'interlock' | 'supply' | 'key';
export type BoardOutput = 'step' | 'direction' | 'enable' | 'warning';
export interface Edge {
  pin: BoardOutput;
  level: boolean;
  cycle: number;
}

export interface BoardListeners {
  /** A byte left, with the cycle at the end of its character. */
  onByte?(byte: number, cycle: number): void;
  onEdge?(edge: Edge): void;
}

/** The wiring: inputs with pull-ups, so that a broken wire reads open, lost, off and covered. */
const FLAG_PIN = 0;
const INPUT_PIN: Record<BoardInput, number> = { interlock: 1, supply: 2, key: 3 };
const OUTPUT: Record<BoardOutput, { port: PortName; bit: number }> = {
  step: { port: 'b', bit: 1 },
  direction: { port: 'b', bit: 0 },
  enable: { port: 'd', bit: 7 },
  warning: { port: 'd', bit: 6 },
};
const OUTPUTS = Object.entries(OUTPUT) as [BoardOutput, { port: PortName; bit: number }][];
const BITS_PER_BYTE = 10;
const CAUSE_REGISTER = 0x54;
const CAUSE: Record<BootCause, number> = { power: 0x01, button: 0x02, brownout: 0x04, watchdog: 0x08 };
const FIRST_RAM = 0x100;

/** The reference board: the firmware as built, its pins wired to a simulated turntable. Time is its own cycles, 16 a microsecond. */
export class EmulatedBoard {
  readonly core: AvrCore;
  readonly eeprom: AvrEeprom;
  readonly table: Turntable;
  private readonly uart: AvrUart;
  private readonly ports: AvrPorts;
  private readonly timers: readonly AvrTimer[];
  private readonly watchdog: AvrWatchdog;
  private readonly byteCycles: number;
  private readonly random;
  private readonly pins: Record<BoardOutput, boolean> = { step: false, direction: false, enable: true, warning: false };
  private readonly closed: Record<BoardInput, boolean> = { interlock: true, supply: true, key: true };
  private wireFreeCycle = 0;

  constructor(
    options: BoardOptions,
    private readonly listeners: BoardListeners = {},
  ) {
    this.core = new AvrCore(options.program);
    this.byteCycles = (BITS_PER_BYTE * CPU_HZ) / (options.hostBaud ?? 115_200);
    this.random = xoroshiro128plus(options.seed ?? 1);
    this.table = new Turntable(options.startSteps ?? 0, options.backlashSteps ?? 0, options.turnSteps ?? null);
    this.eeprom = new AvrEeprom(this.core, new Uint8Array(EEPROM_BYTES).fill(0xff));
    if (options.eeprom !== undefined) this.eeprom.cells.set(options.eeprom);
    this.uart = new AvrUart(this.core, (byte, cycle) => this.listeners.onByte?.(byte, cycle));
    this.ports = new AvrPorts(this.core, (port, levels, cycle) => this.seePins(port, levels, cycle));
    this.timers = TIMERS.map(
      (place, index) =>
        new AvrTimer(this.core, place, ({ unit, level, cycle }) => {
          // Of the compare outputs only that of Timer 1, unit A, is wired: to STEP.
          if (index === 1 && unit === 'a') this.ports.take('b', OUTPUT.step.bit, { level, cycle });
        }),
    );
    this.watchdog = new AvrWatchdog(this.core, () => this.reset('watchdog'));
    // The driver's own pull-up keeps it off while the pin floats.
    this.ports.drive('d', OUTPUT.enable.bit, true);
    for (const input of Object.keys(INPUT_PIN) as BoardInput[]) this.setInput(input, true);
    this.showFlag();
    this.reset('power');
  }

  get cycle(): number {
    return this.core.cycle;
  }

  /** Lets the board run until this cycle. */
  runTo(cycle: number): void {
    this.core.runTo(cycle);
  }

  /** Bytes (one a character) that a host begins to send now, or when its wire is free. Returns the cycle at which the last has arrived. */
  send(bytes: string): number {
    this.wireFreeCycle = Math.max(this.wireFreeCycle, this.cycle);
    for (const byte of Buffer.from(bytes, 'latin1')) {
      this.wireFreeCycle += this.byteCycles;
      this.uart.receive(byte, this.wireFreeCycle);
    }
    return this.wireFreeCycle;
  }

  /** True: interlock closed, supply present, arm key on. */
  setInput(input: BoardInput, on: boolean): void {
    this.closed[input] = on;
    this.ports.drive('c', INPUT_PIN[input], !on);
  }

  /** The wire of an input, or of the home flag, is torn off. */
  breakWire(input: BoardInput | 'flag'): void {
    this.ports.drive('c', input === 'flag' ? FLAG_PIN : INPUT_PIN[input], null);
  }

  output(pin: BoardOutput): boolean {
    return this.pins[pin];
  }

  reset(cause: BootCause): void {
    const powerLost = cause === 'power' || cause === 'brownout';
    this.eeprom.reset(powerLost);
    this.core.reset();
    const { data } = this.core.cpu;
    // What memory holds after power-on is not known: not zeros.
    if (cause === 'power') for (let at = FIRST_RAM; at < data.length; at += 1) data[at] = uniformInt(this.random, 0, 255);
    data[CAUSE_REGISTER] = CAUSE[cause];
    this.uart.reset();
    for (const timer of this.timers) timer.reset();
    this.watchdog.reset(cause === 'watchdog');
    this.ports.reset();
  }

  slip(steps: number): void {
    this.table.slip(steps, this.cycle);
    this.showFlag();
  }

  /** Everything but the program and who listens: enough to go on exactly here. */
  state() {
    const { core, eeprom, table, uart, ports, watchdog, pins, closed, wireFreeCycle } = this;
    return {
      core: core.state(),
      eeprom: eeprom.state(),
      table: table.state(),
      uart: uart.state(),
      ports: ports.state(),
      timers: this.timers.map((timer) => timer.state()),
      watchdog: watchdog.state(),
      pins: { ...pins },
      closed: { ...closed },
      wireFreeCycle,
    };
  }

  restore(state: BoardState): void {
    this.core.restore(state.core);
    this.eeprom.restore(state.eeprom);
    this.table.restore(state.table, this.cycle);
    this.uart.restore(state.uart);
    Object.assign(this.pins, state.pins);
    Object.assign(this.closed, state.closed);
    this.ports.restore(state.ports);
    this.timers.forEach((timer, index) => timer.restore(state.timers[index] as ReturnType<AvrTimer['state']>));
    this.watchdog.restore(state.watchdog);
    this.wireFreeCycle = state.wireFreeCycle;
  }

  private seePins(port: PortName, levels: number, cycle: number): void {
    for (const [pin, place] of OUTPUTS) {
      if (place.port !== port) continue;
      const level = ((levels >> place.bit) & 1) === 1;
      if (level === this.pins[pin]) continue;
      this.pins[pin] = level;
      this.listeners.onEdge?.({ pin, level, cycle });
      if (pin === 'step' && level) this.step(cycle);
    }
  }

  /** The driver turns the motor by a microstep, if it is switched on and has power. */
  private step(cycle: number): void {
    if (this.pins.enable || !this.closed.supply) return;
    this.table.step(this.pins.direction ? 1 : -1, cycle);
    this.showFlag();
  }

  private showFlag(): void {
    this.ports.drive('c', FLAG_PIN, this.table.covered);
  }
}

export type BoardState = ReturnType<EmulatedBoard['state']>;
