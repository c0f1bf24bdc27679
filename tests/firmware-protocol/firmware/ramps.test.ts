import { FirmwareScript } from '@/tests/support/firmware-script';

/**
 * Steps of the firmware against the law of uniform acceleration. The check values are those of an acceleration of 88.889
 * microsteps/s², for which c₀ = 150000 µs: c₁ = 62132.034356, c₁₀ = 23152.069528, c₁₀₀₀ = 2371.1156143 µs, and 1000 steps
 * take 4.743416490 s (design/physics.md, K4, after Austin 2005). 400 of them lead to 266.667 microsteps/s.
 */
const LIMITS = 'teach -20000 20000 8000000 99999999 100000';
const HOMED_MS = 14_000;

/** Homed, at rest at 0, lease live, at 14 s. */
function homed(limits = LIMITS): FirmwareScript {
  const script = new FirmwareScript({ place: -20 }).wait(100).hello().order('renew').order(limits).wait(200).order('home 0000AAAA');
  script.renewing(HOMED_MS - script.now);
  return script.order('status');
}

function movedBy(order: string, seconds: number, limits = LIMITS) {
  const run = homed(limits)
    .order('renew')
    .order(order)
    .renewing(seconds * 1000)
    .order('status')
    .run();
  const { steps, net } = run.stepsAfter(HOMED_MS * 1000);
  const intervals = steps.slice(1).map(({ atUs }, index) => atUs - (steps[index]?.atUs as number));
  return { run, steps, net, intervals };
}

const exact = (n: number, firstUs: number) => firstUs * (Math.sqrt(n + 1) - Math.sqrt(n));

test('a ramp follows the exact law: never shorter than it, and longer by less than one in a thousand', () => {
  const { intervals } = movedBy('move 0000AAAB 4000 8000000 88889 now', 14);
  const firstUs = Math.sqrt(2 / 88.889) * 1e6;
  expect(firstUs).toBeCloseTo(150_000, 0);
  const ratios = intervals.slice(0, 1900).map((us, n) => us / exact(n, firstUs));
  // The acceleration is written in thousandths: 88.889 for 88.8889; a tick is half a microsecond.
  expect(ratios.filter((ratio, n) => ratio < 1 - 1e-6 - 0.5 / (intervals[n] as number) || ratio > 1.001)).toEqual([]);
  for (const [n, us] of [
    [1, 62132.034356],
    [10, 23152.069528],
    [1000, 2371.1156143],
  ] as const)
    expect(Math.abs((intervals[n] as number) / us - 1)).toBeLessThan(0.001);
  // From one interval to the next: the exact law, which (4n − 1)/(4n + 1) misses by 45 % at the first step and by 1.4 % at the second.
  for (const [n, ratio] of [
    [1, 0.4142135623731],
    [2, 0.767326987979],
    [3, 0.8430389971008],
    [5, 0.9040691056184],
    [10, 0.9511298722626],
    [100, 0.9950123755406],
    [1000, 0.9995001248751],
  ] as const)
    expect(Math.abs((intervals[n] as number) / (intervals[n - 1] as number) / ratio - 1)).toBeLessThan(0.0005);
  const thousand = intervals.slice(0, 1000).reduce((sum, us) => sum + us, 0);
  expect(thousand / 1e6).toBeGreaterThanOrEqual(4.74341);
  expect(thousand / 1e6).toBeLessThan(4.7434165 + 0.003);
});

test('the way down mirrors the way up, to the last interval', () => {
  const { intervals } = movedBy('move 0000AAAB 3000 266667 88889 now', 16);
  const back = [...intervals].reverse();
  const unlike = intervals.slice(0, 380).filter((us, n) => Math.abs((back[n] as number) / us - 1) > 0.002);
  expect(unlike).toEqual([]);
});

test.each([
  [1, 266666, 88888],
  [2, 266666, 88888],
  [-3, 266666, 88888],
  [17, 8000000, 99999999],
  [-4000, 8000000, 50000000],
  [799, 266666, 88888],
  [-800, 123456, 88888],
  [9999, 7777777, 12345678],
  [5, 1500, 99999999],
])('a move by %d at %d and %d is exact to the step, never too fast, never too steep', (steps, speed, acceleration) => {
  const size = Math.abs(steps);
  const [v, a] = [speed / 1000, acceleration / 1000];
  const duration = size > (v * v) / a ? size / v + v / a : 2 * Math.sqrt(size / a);
  const { net, steps: made, intervals, run } = movedBy(`move 0000AAAB ${steps} ${speed} ${acceleration} now`, Math.ceil(duration + 1));
  expect(net).toBe(steps);
  expect(made).toHaveLength(size);
  expect(run.of('ended').at(-1)).toMatchObject({ tag: '0000AAAB', position: steps, cause: 'done' });
  expect(run.last.body).toMatchObject({ word: 'ok', state: 'rest', position: steps });
  expect(Math.min(Infinity, ...intervals)).toBeGreaterThanOrEqual(1e6 / v);
  // Steepness: speeds of neighbouring intervals against the time between their middles, to the half microsecond of a tick.
  const tooSteep = intervals.slice(1).filter((us, index) => {
    const before = intervals[index] as number;
    const shorter = Math.min(us, before);
    return Math.abs(1e6 / us - 1e6 / before) > (a * 1.02 * (us + before)) / 2e6 + 1e6 / shorter / shorter;
  });
  expect(tooSteep).toEqual([]);
});

test('a timed move makes its first step at its time, to the tick, and says so', () => {
  const run = homed().order('renew').order('move 0000AAAB 100 266666 88888 000000015.123457').renewing(4000).run();
  const { steps } = run.stepsAfter(HOMED_MS * 1000);
  expect(steps[0]?.atUs).toBe(15_123_457);
  expect(run.of('began').at(-1)).toMatchObject({ atUs: 15_123_457, position: 0 });
});

test('a move to where the table stands begins and ends without a step', () => {
  const { net, steps, run } = movedBy('move 0000AAAB 0 266666 88888 now', 1);
  expect([net, steps.length]).toEqual([0, 0]);
  expect(run.of('began').at(-1)).toMatchObject({ tag: '0000AAAB', position: 0 });
  expect(run.of('ended').at(-1)).toMatchObject({ tag: '0000AAAB', position: 0, cause: 'done' });
});

test('an interval of many timer turns, and a move that lasts beyond the turn of 32 bits, keep their count', () => {
  // 2¹⁶ ticks are 33 ms, 2³² ticks 2147 s: 6 steps at 0.0025 steps/s take 2000 s, from 1000 s on.
  const script = homed().wait(1_000_000 - HOMED_MS);
  script.hello().order('renew', { session: '00010002' });
  const order = 'move 0000AAAB 6 2500 99999999 000001001.000000';
  script.order(order, { session: '00010002' });
  for (let left = 2100; left > 0; left -= 1) script.order('renew', { session: '00010002' }).wait(980);
  const run = script.order('status', { session: '00010002' }).run();
  const { steps, net } = run.stepsAfter(1_000_000_000);
  expect(net).toBe(6);
  expect(steps[0]?.atUs).toBe(1_001_000_000);
  expect(run.last.body).toMatchObject({ state: 'rest', position: 6 });
  expect(run.last.receivedUs).toBeGreaterThan(3_100_000_000);
  expect(run.of('ended').at(-1)).toMatchObject({ cause: 'done', position: 6 });
});
