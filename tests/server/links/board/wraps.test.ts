import type { OkBody, Order, Reply } from '@/firmware-protocol/codec';
import { encode } from '@/firmware-protocol/codec';
import { BoardBench } from '@/scripts/soak/board/board-bench';
import { BoardRam } from '@/tests/support/board-ram';

/**
 * Clocks and counters of the firmware as built for the board, where they wrap. Nobody waits for that: shortly before, the variables are written
 * into the emulated memory while the program sleeps, so that clock and count go on from there.
 */

const bench = new BoardBench();
bench.home();
const ram = new BoardRam(bench);
const homed = bench.keep();

const TICK_HZ = 2_000_000;
const TICKS_PER_TURN = 65_536;
const CYCLES_PER_US = 16;

beforeEach(() => {
  homed();
  bench.pass(2_500);
  bench.edges.length = 0;
  bench.events.length = 0;
  expect(bench.session.board.core.asleep).toBe(true);
});

const input = (on: boolean) => {
  bench.session.do({ kind: 'input', input: 'key', on }, bench.ms);
  bench.pass(30);
};

/** The free running timer goes on at so many ticks of 32 bits; the time that it tells does not change. */
function turnTimerTo(ticks: number): void {
  const more = Math.floor(ticks / TICKS_PER_TURN) - ram.read('board::turns', 2);
  ram.write('board::turns', 2, Math.floor(ticks / TICKS_PER_TURN));
  ram.write('core::clock::baseTick', 4, (ram.read('core::clock::baseTick', 4) + more * TICKS_PER_TURN + 2 ** 32) % 2 ** 32);
}

const hadRunFor = (seconds: number) => ram.write('core::clock::baseSeconds', 4, Math.floor(seconds));

/** Half a second before each; 2^32 ticks of 0.5 µs are 2147.5 s, 2^32 µs 4295 s, 2^32 ms 49.7 days. */
const wraps: [string, () => void][] = [
  ['the timer, after 36 minutes', () => turnTimerTo(2 ** 32 - TICK_HZ / 2)],
  ['the sign of the timer, after 18 minutes', () => turnTimerTo(2 ** 31 - TICK_HZ / 2)],
  ['32 bits of microseconds, after 72 minutes', () => hadRunFor(2 ** 32 / 1e6 - 1)],
  ['32 bits of milliseconds, after 50 days', () => hadRunFor(2 ** 32 / 1e3 - 1)],
  ['the greatest time that a stamp can tell, less ten seconds', () => hadRunFor(999_999_989)],
];

describe.each(wraps)('over the wrap of %s', (_name, set) => {
  test('a timed move begins on its microsecond, at the pin and in its event, and ends on its step', () => {
    set();
    const { receivedUs } = bench.ask({ word: 'renew' });
    const beganAt = { us: receivedUs, cycle: bench.session.lastArrivedCycle };
    const beginUs = receivedUs + 1_800_000;
    const tag = bench.nextTag();
    const ended = bench.motion({ word: 'move', tag, position: 400, speed: 2_000_000, acceleration: 8_000_000, beginUs });
    const began = bench.events.find(({ what }) => what.word === 'began');
    expect(began?.atUs).toBe(beginUs);
    const firstStep = bench.edges.find(({ pin, level }) => pin === 'step' && level)?.cycle ?? 0;
    // The stamp of the line feed is taken in the interrupt after its last bit: some µs late.
    expect(Math.abs((firstStep - beganAt.cycle) / CYCLES_PER_US - 1_800_000)).toBeLessThan(40);
    expect(ended.what).toMatchObject({ cause: 'done', position: 400 });
    // A ramp up and down of 0.25 s each, 0.5 s long, would be 500 steps: 400 steps of this triangle take 2 √(400 / 8000) s.
    expect((ended.atUs - beginUs) / 1e6).toBeCloseTo(2 * Math.sqrt(400 / 8000), 2);
  });

  test('a lease of 2.0 s lapses after 2.0 s, neither at once nor never', () => {
    set();
    const { receivedUs } = bench.ask({ word: 'renew' });
    bench.ask({ word: 'move', tag: bench.nextTag(), position: 40_000, speed: 4_000_000, acceleration: 8_000_000, beginUs: null });
    bench.pass(3_500);
    const lapsed = bench.events.find(({ what }) => what.word === 'lease');
    expect(((lapsed?.atUs ?? 0) - receivedUs) / 1e6).toBeCloseTo(2, 3);
    expect(bench.events.find(({ what }) => what.word === 'ended')?.what).toMatchObject({ cause: 'lease' });
  });
});

test('request numbers go round: what comes after 65535 is new, once', () => {
  const session = bench.ask({ word: 'status' }).session;
  const put = (number: number, order: Order) => bench.put(encode({ kind: 'request', epoch: 1, session, number, order })) as Reply;
  for (const number of [32_000, 64_000, 65_535]) expect(put(number, { word: 'renew' }).body.word).toBe('ok');
  const move: Order = { word: 'move', tag: bench.nextTag(), position: 30, speed: 1_000_000, acceleration: 8_000_000, beginUs: null };
  const first = put(0, move);
  expect(first.body.word).toBe('ok');
  expect(put(0, move)).toEqual(first);
  expect(put(65_535, { word: 'status' }).body).toMatchObject({ word: 'no', code: 'old', detail: 0 });
  bench.pass(500);
  expect(bench.events.filter(({ what }) => what.word === 'began')).toHaveLength(1);
  expect(put(1, { word: 'status' }).body).toMatchObject({ word: 'ok', position: 30 });
});

test('dropped lines are counted modulo 65536 (SPEC 5.4)', () => {
  ram.write('core::controller::dropped', 2, 65_534);
  const dropped = () => (bench.ask({ word: 'status' }).body as OkBody).dropped;
  expect(dropped()).toBe(65_534);
  for (const line of ['x 1', 'x 2', 'x 3']) bench.put(`${line}\n`);
  expect(dropped()).toBe(1);
});

test.each([256, 65_536])('events around number %d keep their numbers, and are read again from the ring', (number) => {
  ram.write('core::events::last', 4, number - 3);
  ram.write('core::events::fresh', 4, number - 2);
  for (const on of [false, true, false, true, false, true]) input(on);
  const numbers = bench.events.map((event) => event.number);
  expect(numbers).toEqual([-2, -1, 0, 1, 2, 3].map((more) => number + more));
  const told = [...bench.events];
  bench.events.length = 0;
  expect(bench.ask({ word: 'events', from: number - 2 }).body).toMatchObject({ word: 'ok', event: number + 3 });
  bench.pass(100);
  expect(bench.events).toEqual(told);
});

test('sessions of 16 bits go round without repeating the last ones, and none is the session that is none', () => {
  const opened = () => {
    bench.hello();
    return bench.ask({ word: 'status' }).session;
  };
  ram.write('core::session::count', 2, 65_534);
  const around = [opened(), opened(), opened()];
  expect(around).toEqual(['0001FFFF', '00010000', '00010001']);
  // The low half of the boot identifier is 0 after 65536 starts: then the count must not be 0 too (SPEC 3.2).
  ram.write('core::memory::boots', 4, 65_536);
  ram.write('core::session::count', 2, 65_535);
  expect(opened()).toBe('00000001');
});
