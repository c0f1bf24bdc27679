import os from 'node:os';
import { performance } from 'node:perf_hooks';
import { RealClock } from '@/server/boot/real-clock';

/** The system's two clocks, played: true UTC runs `offsetMs` ahead of the monotonic clock and is told in whole milliseconds. */
function play(): { at(monotonicMs: number, offsetMs: number): void } {
  const now = jest.spyOn(performance, 'now');
  const date = jest.spyOn(Date, 'now');
  return {
    at: (monotonicMs, offsetMs) => {
      now.mockReturnValue(monotonicMs);
      date.mockReturnValue(Math.floor(monotonicMs + offsetMs));
    },
  };
}

afterEach(() => jest.restoreAllMocks());

test('UTC has the fraction of a millisecond that the system cuts off', () => {
  const system = play();
  system.at(10.2, 1_000_000.6);
  const clock = new RealClock();
  for (let monotonicMs = 11; monotonicMs < 40; monotonicMs += 0.37) {
    system.at(monotonicMs, 1_000_000.6);
    clock.utcMs();
  }
  system.at(41.1, 1_000_000.6);
  expect(Math.abs(clock.utcMs() - 1_000_041.7)).toBeLessThan(0.1);
});

test.each([3_600_000, -3_600_000, 0.8, -0.8])(
  'a step of the system clock by %s ms is followed at once to within a millisecond',
  (stepMs) => {
    const system = play();
    system.at(10, 1_000_000);
    const clock = new RealClock();
    clock.utcMs();
    system.at(20, 1_000_000 + stepMs);
    expect(Math.abs(clock.utcMs() - (1_000_020 + stepMs))).toBeLessThanOrEqual(1);
  },
);

describe('while a run goes on', () => {
  const steadyClock = () => {
    const system = play();
    let goesOn = true;
    system.at(10, 1_000_000);
    const clock = new RealClock();
    clock.keepSteadyWhile(() => goesOn);
    clock.utcMs();
    return { system, clock, end: () => void (goesOn = false) };
  };

  test.each([3_600_000, -3_600_000, 1_000, -1_000])(
    'a wall clock that is set by %s ms is told and not followed, until the run is over',
    (byMs) => {
      const { system, clock, end } = steadyClock();
      system.at(20, 1_000_000 + byMs);
      expect(Math.abs(clock.utcMs() - 1_000_020)).toBeLessThanOrEqual(1);
      expect(Math.abs(clock.wallUtcMs() - (1_000_020 + byMs))).toBeLessThanOrEqual(1);
      end();
      expect(Math.abs(clock.utcMs() - (1_000_020 + byMs))).toBeLessThanOrEqual(1);
    },
  );

  test('a slow correction is followed', () => {
    const { system, clock } = steadyClock();
    for (let turn = 1; turn <= 100; turn += 1) {
      system.at(10 + 500 * turn, 1_000_000 + turn);
      clock.utcMs();
    }
    expect(Math.abs(clock.utcMs() - (1_000_100 + 50_010))).toBeLessThanOrEqual(1);
  });

  test('what the machine slept is followed: the wall clock goes on, and so does the time since it was switched on', () => {
    const uptime = jest.spyOn(os, 'uptime').mockReturnValue(100);
    const { system, clock } = steadyClock();
    system.at(20, 1_000_000 + 7_200_000);
    uptime.mockReturnValue(7_300);
    expect(Math.abs(clock.utcMs() - (1_000_020 + 7_200_000))).toBeLessThanOrEqual(15);
  });
});
