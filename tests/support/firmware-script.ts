import { decodeLine, type EventMessage, type Reply } from '@/firmware-protocol/codec';
import { sealed } from '@/scripts/soak/fuzz/almost-lines';
import { hexOf, runFirmware, type HostRun } from '@/scripts/soak/fuzz/firmware-host';

export const LEVEL = { interlock: 2, supply: 4, key: 8 } as const;
const MS = 1000;
const SESSION = '00010001';

/** A script for the firmware that is written like a conversation: times in ms since the beginning. */
export class FirmwareScript {
  readonly entries: [number, string][] = [];
  private ms = 0;
  private number = 0;
  private levels = LEVEL.interlock + LEVEL.supply + LEVEL.key;

  /** The controller starts at once; the table stands at `place` microsteps from the edge. */
  constructor({ place = 0, play = 0, memory = '' }: { place?: number; play?: number; memory?: string } = {}) {
    this.put(`table ${place} ${play}`).put('steps');
    if (memory !== '') this.put(`memory ${memory}`);
    this.put('start power');
  }

  put(what: string): this {
    this.entries.push([this.ms * MS, what]);
    return this;
  }

  wait(ms: number): this {
    this.ms += ms;
    return this;
  }

  /** Time since the beginning, ms. */
  get now(): number {
    return this.ms;
  }

  raw(bytes: string): this {
    return this.put(`bytes ${hexOf(bytes)}`);
  }

  hello(epoch = 7): this {
    this.number = 0;
    return this.raw(sealed(`q ${epoch} 00000000 1 hello 1 0`)).wait(50);
  }

  /** An order in the open session. */
  order(order: string, { session = SESSION, epoch = 7 } = {}): this {
    this.number += 1;
    return this.raw(sealed(`q ${epoch} ${session} ${this.number} ${order}`)).wait(20);
  }

  input(input: keyof typeof LEVEL, on: boolean): this {
    this.levels = on ? this.levels | LEVEL[input] : this.levels & ~LEVEL[input];
    return this.put(`levels ${this.levels}`);
  }

  /** Waits and keeps the lease live. */
  renewing(ms: number): this {
    for (let left = ms; left > 0; left -= 1000) this.order('renew').wait(Math.min(left, 1000) - 20);
    return this;
  }

  run(): FirmwareRun {
    return runAll([this])[0] as FirmwareRun;
  }
}

/** Runs many scripts at once, each on a board of its own. */
export function runAll(scripts: readonly FirmwareScript[]): FirmwareRun[] {
  return runFirmware(scripts.map(({ entries, now }) => [...entries, [now * MS, 'end']])).map((run) => new FirmwareRun(run));
}

/** What came of a script. */
export class FirmwareRun {
  readonly replies: Reply[] = [];
  readonly events: EventMessage[] = [];

  constructor(readonly host: HostRun) {
    for (const { line } of host.sent) {
      const item = decodeLine(line);
      if (item.kind === 'reply') this.replies.push(item);
      else if (item.kind === 'event') this.events.push(item);
      else throw new Error(`the firmware sent ${JSON.stringify(line)}`);
    }
  }

  /** Events of one kind. */
  of<W extends EventMessage['what']['word']>(word: W) {
    return this.events
      .filter((event) => event.what.word === word)
      .map(({ atUs, what }) => ({ atUs, ...(what as Extract<EventMessage['what'], { word: W }>) }));
  }

  /** Steps, their net count included, from a time on. */
  stepsAfter(us: number) {
    const steps = this.host.steps.filter(({ atUs }) => atUs >= us);
    return { steps, net: steps.reduce((sum, { direction }) => sum + direction, 0) };
  }

  get last(): Reply {
    return this.replies.at(-1) as Reply;
  }
}
