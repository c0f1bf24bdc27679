import type { AvrCore, AvrInterrupt, WriteHook } from './avr-core';

export type PortName = 'b' | 'c' | 'd';

/** Register PINx of each port; DDRx and PORTx follow (data sheet DS40002061, section 14.4). */
const PIN = { b: 0x23, c: 0x26, d: 0x29 } as const;
const CHANGE_MASK = { b: 0x6b, c: 0x6c, d: 0x6d } as const;
const CHANGE_CONTROL = 0x68;
const CHANGE_FLAGS = 0x3b;
const CHANGE = {
  b: { bit: 0x01, address: 0x06 },
  c: { bit: 0x02, address: 0x08 },
  d: { bit: 0x04, address: 0x0a },
} as const;
const PORTS = ['b', 'c', 'd'] as const;

interface Port {
  /** What drives the pins from outside: levels, and which pins are driven at all. */
  levels: number;
  driven: number;
  /** Pins that a timer drives, and their levels. */
  taken: number;
  takenLevels: number;
  /** As last seen on the pins. */
  seen: number;
}

/** The pins: outputs, inputs with pull-ups, compare outputs that override a port, and the pin change interrupts. */
export class AvrPorts {
  private readonly ports: Record<PortName, Port> = { b: emptyPort(), c: emptyPort(), d: emptyPort() };
  private readonly changes: Record<PortName, AvrInterrupt>;

  /** `onPins`: the levels of a port's pins, outputs and inputs, changed. */
  constructor(
    private readonly core: AvrCore,
    private readonly onPins: (port: PortName, levels: number, cycle: number) => void,
  ) {
    this.changes = { b: changeOf('b'), c: changeOf('c'), d: changeOf('d') };
    for (const name of PORTS) this.hook(name);
    core.cpu.writeHooks[CHANGE_CONTROL] = (value: number) => {
      for (const name of PORTS) core.cpu.updateInterruptEnable(this.changes[name], value);
      core.cpu.data[CHANGE_CONTROL] = value;
      return true;
    };
    core.cpu.writeHooks[CHANGE_FLAGS] = (value: number) => {
      for (const name of PORTS) core.cpu.clearInterruptByFlag(this.changes[name], value);
      return true;
    };
  }

  /** All pins become inputs without pull-ups; what is outside stays. */
  reset(): void {
    for (const name of PORTS) this.look(name, this.core.cycle);
  }

  /** Drives a pin from outside; null: nothing is connected to it. */
  drive(name: PortName, bit: number, level: boolean | null): void {
    const port = this.ports[name];
    const mask = 1 << bit;
    port.driven = level === null ? port.driven & ~mask : port.driven | mask;
    port.levels = level === true ? port.levels | mask : port.levels & ~mask;
    this.look(name, this.core.cycle);
  }

  /** A timer drives a pin; null: the port does again. */
  take(name: PortName, bit: number, { level, cycle }: { level: boolean | null; cycle: number }): void {
    const port = this.ports[name];
    const mask = 1 << bit;
    port.taken = level === null ? port.taken & ~mask : port.taken | mask;
    port.takenLevels = level === true ? port.takenLevels | mask : port.takenLevels & ~mask;
    this.look(name, cycle);
  }

  state() {
    return structuredClone(this.ports);
  }

  restore(ports: ReturnType<AvrPorts['state']>): void {
    for (const name of PORTS) {
      Object.assign(this.ports[name], ports[name]);
      this.onPins(name, this.ports[name].seen, this.core.cycle);
      this.core.cpu.updateInterruptEnable(this.changes[name], this.core.cpu.data[CHANGE_CONTROL] as number);
    }
  }

  private hook(name: PortName): void {
    const { cpu } = this.core;
    const pin = PIN[name];
    const [direction, output] = [pin + 1, pin + 2];
    for (const address of [direction, output])
      cpu.writeHooks[address] = (value: number) => {
        cpu.data[address] = value;
        this.look(name, cpu.cycles);
        return true;
      };
    cpu.readHooks[pin] = () => this.ports[name].seen;
    // Section 14.2.2: a one written to PINx toggles the output.
    cpu.writeHooks[pin] = (...[value, , , mask]: Parameters<WriteHook>) => {
      cpu.data[output] = (cpu.data[output] as number) ^ (value & mask);
      this.look(name, cpu.cycles);
      return true;
    };
  }

  private look(name: PortName, cycle: number): void {
    const { data } = this.core.cpu;
    const port = this.ports[name];
    const [direction, output] = [data[PIN[name] + 1] as number, data[PIN[name] + 2] as number];
    const out = (output & ~port.taken) | (port.takenLevels & port.taken);
    const levels = (out & direction) | (((port.levels & port.driven) | (output & ~port.driven)) & ~direction & 0xff);
    const changed = levels ^ port.seen;
    if (changed === 0) return;
    port.seen = levels;
    if ((changed & (data[CHANGE_MASK[name]] as number)) !== 0) this.core.cpu.setInterruptFlag(this.changes[name]);
    this.onPins(name, levels, cycle);
  }
}

const emptyPort = (): Port => ({ levels: 0, driven: 0, taken: 0, takenLevels: 0, seen: 0 });

function changeOf(name: PortName): AvrInterrupt {
  const { bit, address } = CHANGE[name];
  return { address, flagRegister: CHANGE_FLAGS, flagMask: bit, enableRegister: CHANGE_CONTROL, enableMask: bit };
}
