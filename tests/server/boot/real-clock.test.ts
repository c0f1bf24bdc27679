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
