import { referenceFirmware } from '@/server/links/board/firmware-file';
import { EmulatedBoard } from '@/server/links/board/emulated-board';
import { CPU_HZ, CYCLES_PER_US } from '@/server/links/board/avr-core';
import { decodeLine, type EventMessage, type Reply } from '@/firmware-protocol/codec';
import { sealed } from '@/scripts/soak/fuzz/almost-lines';

/** The image as it is flashed, on the emulated board: what its STEP, DIR and ENABLE pins do, to the cycle. */
class Bench {
  readonly rises: number[] = [];
  readonly pulsesUs: number[] = [];
  readonly replies: Reply[] = [];
  readonly events: EventMessage[] = [];
  /** Shortest time from a change of DIR to a step, µs. */
  directionUs = Infinity;
  readonly board: EmulatedBoard;
  private line = '';
  private number = 0;
  private turned = -Infinity;

  constructor(startSteps: number) {
    this.board = new EmulatedBoard(
      { program: referenceFirmware(), startSteps },
      { onByte: (byte) => this.hear(byte), onEdge: ({ pin, level, cycle }) => this.see(pin, level, cycle) },
    );
  }

  private hear(byte: number): void {
    if (byte !== 10) return void (this.line += String.fromCharCode(byte));
    const item = decodeLine(this.line);
    if (item.kind === 'reply') this.replies.push(item);
    else if (item.kind === 'event') this.events.push(item);
    else throw new Error(`the board sent ${JSON.stringify(this.line)}`);
    this.line = '';
  }

  private see(pin: string, level: boolean, cycle: number): void {
    if (pin === 'direction') this.turned = cycle;
    if (pin !== 'step') return;
    if (level) {
      this.rises.push(cycle);
      this.directionUs = Math.min(this.directionUs, (cycle - this.turned) / CYCLES_PER_US);
    } else this.pulsesUs.push((cycle - (this.rises.at(-1) as number)) / CYCLES_PER_US);
  }

  get seconds(): number {
    return this.board.cycle / CPU_HZ;
  }

  run(ms: number): void {
    this.board.runTo(this.board.cycle + Math.round((ms * CPU_HZ) / 1000));
  }

  order(order: string): void {
    this.number += 1;
    this.board.send(sealed(`q 7 00010001 ${this.number} ${order}`));
    this.run(15);
  }

  /** A line that is never quiet: what a host would not do, but what the steps must not mind. */
  chatter(until: () => boolean): void {
    for (let asked = 0; !until() && asked < 2000; asked += 1)
      this.order(asked % 90 === 0 ? 'renew' : asked % 2 === 0 ? 'status' : 'limits');
  }

  endedOf(tag: string) {
    return this.events.find(({ what }) => what.word === 'ended' && what.tag === tag)?.what;
  }
}

function homed(startSteps: number): Bench {
  const bench = new Bench(startSteps);
  bench.run(100);
  bench.board.send(sealed('q 7 00000000 1 hello 1 0'));
  bench.run(30);
  bench.order('renew');
  bench.order('teach -20000 20000 8000000 50000000 200000');
  bench.run(200);
  bench.order('home 0000AAAA');
  for (let second = 0; second < 13; second += 1) {
    bench.order('renew');
    bench.run(985);
  }
  return bench;
}

const stampOf = (us: number) => `${String(1e9 + Math.floor(us / 1e6)).slice(1)}.${String(1e6 + (us % 1e6)).slice(1)}`;
const hexTag = (tag: number) => (0xb000 + tag).toString(16).toUpperCase().padStart(8, '0');

const MOVES = [
  [5000, 8_000_000, 50_000_000],
  [-2500, 8_000_000, 20_000_000],
  [-2499, 266_666, 88_888],
  [-2400, 500_000, 2_000_000],
  [1234, 7_654_321, 12_345_678],
  [1234 - 700, 2_000_000, 50_000_000],
  [0, 3_333_333, 7_777_777],
] as const;

test('moves under a busy line: every step counted, none too near to the one before, each start at its time', () => {
  const bench = homed(-20);
  expect(bench.board.table.track.at(Infinity)).toBe(0);
  let place = 0;
  const startErrorsUs: number[] = [];
  for (const [tag, [target, speed, acceleration]] of MOVES.entries()) {
    bench.order('renew');
    bench.rises.length = 0;
    const beginUs = Math.round(bench.seconds * 1e6) + 60_000 + 137 * tag;
    bench.order(`move ${hexTag(tag)} ${target} ${speed} ${acceleration} ${stampOf(beginUs)}`);
    bench.chatter(() => bench.endedOf(hexTag(tag)) !== undefined);
    expect(bench.endedOf(hexTag(tag))).toMatchObject({ position: target, cause: 'done' });
    expect(bench.rises).toHaveLength(Math.abs(target - place));
    expect(bench.board.table.track.at(Infinity)).toBe(target);
    startErrorsUs.push((bench.rises[0] as number) / CYCLES_PER_US - beginUs);
    const gapsUs = bench.rises.slice(1).map((cycle, index) => (cycle - (bench.rises[index] as number)) / CYCLES_PER_US);
    expect(Math.min(Infinity, ...gapsUs)).toBeGreaterThanOrEqual(1e9 / speed - 1e-6);
    place = target;
    // The table settles for √(2/a), at most 0.15 s here (SPEC 8.2).
    bench.run(150);
  }
  // The clock begins a moment after the reset, always the same one: that apart, each start is exact to the tick.
  expect(Math.max(...startErrorsUs) - Math.min(...startErrorsUs)).toBeLessThanOrEqual(0.5);
  expect(Math.min(...startErrorsUs)).toBeGreaterThan(0);
  expect(Math.max(...startErrorsUs)).toBeLessThan(1000);
  expect(Math.min(...bench.pulsesUs)).toBeGreaterThanOrEqual(5);
  expect(bench.directionUs).toBeGreaterThanOrEqual(60);
  for (const { turnUs } of bench.replies) expect(turnUs).toBeLessThan(10_000);
});

test('stops at full speed end where the count says, and off ends with the step under way', () => {
  for (const [word, most] of [
    ['hold', 1600],
    ['stop keep', 640],
    ['off', 1],
  ] as const) {
    const bench = homed(-20);
    bench.order('renew');
    bench.rises.length = 0;
    bench.order('move 0000BBBB 19000 8000000 20000000 now');
    bench.run(800);
    const arrived = bench.board.send(sealed(`q 0 00000000 0 ${word}`));
    bench.run(1500);
    const ended = bench.endedOf('0000BBBB');
    expect(ended).toMatchObject({ cause: word.split(' ')[0], position: word === 'off' ? null : bench.board.table.track.at(Infinity) });
    // v²/2a, and the 2 ms at most that a stop takes to be read.
    expect(bench.rises.filter((cycle) => cycle > arrived).length).toBeLessThanOrEqual(most + 16);
    expect(bench.board.output('enable')).toBe(word === 'off');
  }
});
