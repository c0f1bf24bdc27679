import { lookedInto } from '@/server/engine/look';
import { SteadyClock } from '@/server/engine/steady-clock';
import type { SampleReader } from '@/server/interfaces/sample-reader';
import { runStart, shortProtocol, startUtcMs } from './rig-bench';

/** A run that goes on beside a wall clock that is set; all of it is played. */
function play() {
  const now = { monotonicMs: 1_000, aheadMs: 1e12, sleptMs: 0, goesOn: true };
  const after = jest.fn(() => () => undefined);
  const wall = { monotonicMs: () => now.monotonicMs, utcMs: () => now.monotonicMs + now.aheadMs, after };
  const clock = new SteadyClock(
    wall,
    () => now.goesOn,
    () => now.sleptMs,
  );
  clock.utcMs();
  return { now, wall, clock };
}

test.each([3_600_000, -3_600_000, 1_000, -1_000])('a wall clock that is set by %s ms is not followed before the run is over', (byMs) => {
  const { now, clock } = play();
  now.monotonicMs += 500;
  now.aheadMs += byMs;
  expect(clock.utcMs()).toBe(1e12 + 1_500);
  expect(clock.wallUtcMs()).toBe(1e12 + 1_500 + byMs);
  now.monotonicMs += 500;
  expect(clock.utcMs()).toBe(1e12 + 2_000);
  now.goesOn = false;
  expect(clock.utcMs()).toBe(1e12 + 2_000 + byMs);
});

test('without a run it is followed at once', () => {
  const { now, clock } = play();
  now.goesOn = false;
  now.aheadMs -= 5_000;
  expect(clock.utcMs()).toBe(1e12 - 4_000);
});

test('a slow correction is followed', () => {
  const { now, clock } = play();
  for (let turn = 1; turn <= 100; turn += 1) {
    now.monotonicMs += 500;
    now.aheadMs += 1;
    expect(clock.utcMs()).toBe(now.monotonicMs + now.aheadMs);
  }
});

test('what the machine slept before a run, and how far its clock crept while nobody looked, is none of the run', () => {
  const { now, clock } = play();
  now.goesOn = false;
  clock.utcMs();
  now.aheadMs += 8 * 3_600_000 + 300;
  now.sleptMs += 8 * 3_600_000;
  now.goesOn = true;
  expect(clock.utcMs()).toBe(now.monotonicMs + now.aheadMs);
  now.monotonicMs += 500;
  now.aheadMs += 30;
  expect(clock.utcMs()).toBe(now.monotonicMs + now.aheadMs - 30);
});

test('what the machine slept is followed, and no more', () => {
  const { now, clock } = play();
  now.sleptMs += 7_200_000;
  now.aheadMs += 7_200_000 + 30_000;
  expect(clock.utcMs()).toBe(1e12 + 1_000 + 7_200_000);
});

test('a thread that is kept waiting between the clocks takes that for no jump', () => {
  const { now, wall, clock } = play();
  const { utcMs } = wall;
  wall.utcMs = () => {
    now.monotonicMs += 40;
    return utcMs();
  };
  expect(clock.utcMs()).toBe(now.monotonicMs + now.aheadMs);
  wall.utcMs = utcMs;
  expect(clock.utcMs()).toBe(now.monotonicMs + now.aheadMs);
});

test('durations and timers are those of the clock behind it', () => {
  const { now, wall, clock } = play();
  const task = () => undefined;
  clock.after(70, task);
  expect(wall.after).toHaveBeenCalledWith(70, task);
  expect(clock.monotonicMs()).toBe(now.monotonicMs);
});

test('samples, which wall clocks stamp, are seen in the time that the run keeps to', () => {
  const hourMs = 3_600_000;
  const windows: { fromUtcMs: number; toUtcMs: number }[] = [];
  const samples: SampleReader = {
    deflection: () => null,
    read: (_, window) => {
      windows.push(window);
      const stamps = Array.from({ length: 11 }, (__, second) => window.toUtcMs - 10_000 + 1000 * second);
      return { unit: 'degC', rateHz: 1, utcMs: Float64Array.from(stamps), value: new Float64Array(11).fill(20) };
    },
  };
  const nowUtcMs = startUtcMs + 60_000;
  const clock = { monotonicMs: () => 0, utcMs: () => nowUtcMs, wallUtcMs: () => nowUtcMs + hourMs, after: () => () => undefined };
  const step = { kind: 'wait' as const, until: { channel: 'box temperature', below: 30, for_s: 5 } };
  const look = { kind: 'wait' as const, seq: 1, step, fromUtcMs: startUtcMs, angleDeg: 0 };
  const event = lookedInto({ start: runStart(shortProtocol), clock, samples }, look, { utcMs: nowUtcMs, uS: 0.001 });
  expect(windows).toEqual([{ fromUtcMs: nowUtcMs - 5_000 + hourMs, toUtcMs: nowUtcMs + hourMs }]);
  expect(event).toMatchObject({ type: 'looked', finding: { kind: 'wait', found: { met: true } } });
});
