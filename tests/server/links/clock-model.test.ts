import { uniformFloat64 } from 'pure-rand/distribution/uniformFloat64';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { ClockModel, type ClockExchange } from '@/server/links/clock-model';

const BYTE_MS = 10_000 / 115_200;

interface Truth {
  /** Controller minus host at host time 0, ms. */
  offsetMs: number;
  ratePpm: number;
}

const controllerMs = ({ offsetMs, ratePpm }: Truth, hostMs: number) => offsetMs + hostMs * (1 + ratePpm * 1e-6);

/** An exchange with the given delays on the way out and back, ms, over and above the byte times. */
function exchange(truth: Truth, atMs: number, way: { outMs: number; backMs: number }): ClockExchange {
  const [outMs, inMs, turnMs] = [23 * BYTE_MS, 76 * BYTE_MS, 0.1];
  const receivedMs = atMs + outMs + way.outMs;
  const repliesMs = receivedMs + turnMs;
  return {
    t1Ms: atMs,
    t2Us: Math.round(controllerMs(truth, receivedMs) * 1000),
    t3Us: Math.round(controllerMs(truth, repliesMs) * 1000),
    t4Ms: repliesMs + inMs + way.backMs,
    outMs,
    inMs,
  };
}

test('one exchange gives the offset with half of its delay as the bound', () => {
  const truth = { offsetMs: 4_321_500, ratePpm: 0 };
  const model = new ClockModel();
  expect(model.known).toBe(false);
  expect(model.add(exchange(truth, 1000, { outMs: 2, backMs: 0 }))).toBe(true);
  const estimate = model.offsetAt(1000);
  // RFC 5905: |offset error| ≤ delay / 2; here all of the delay lies on one way, so the error is 1 ms.
  expect(estimate.ms - truth.offsetMs).toBeCloseTo(1, 2);
  // Rectangular over ± 1 ms.
  expect(estimate.uMs).toBeCloseTo(1 / Math.sqrt(3), 1);
});

test('an exchange faster than its own bytes is impossible and not used', () => {
  const model = new ClockModel();
  expect(model.add(exchange({ offsetMs: 0, ratePpm: 0 }, 0, { outMs: -0.3, backMs: 0 }))).toBe(false);
  expect(model.known).toBe(false);
});

test('finds a crystal 50 ppm off within 1 ppm from a heartbeat of three minutes', () => {
  const truth = { offsetMs: -77_000.25, ratePpm: 50 };
  const random = xoroshiro128plus(7);
  const model = new ClockModel();
  for (let atMs = 0; atMs < 180_000; atMs += 500) {
    // A scheduler: mostly quick, sometimes late by up to 20 ms, on either way.
    const late = () => (uniformFloat64(random) < 0.1 ? 20 : 0.4) * uniformFloat64(random);
    model.add(exchange(truth, atMs, { outMs: late(), backMs: late() }));
  }
  const [early, now] = [model.offsetAt(60_000).ms, model.offsetAt(180_000).ms];
  expect(((now - early) / 120_000) * 1e6).toBeGreaterThan(49);
  expect(((now - early) / 120_000) * 1e6).toBeLessThan(51);
  const controllerUs = controllerMs(truth, 170_000) * 1000;
  expect(Math.abs(model.hostMsAt(controllerUs).ms - 170_000)).toBeLessThan(0.2);
  expect(Math.abs(model.controllerUsAt(170_000) - controllerUs)).toBeLessThan(200);
});

test('to the controller’s clock and back is the way there and back', () => {
  const model = new ClockModel();
  const truth = { offsetMs: 1234.5, ratePpm: -30 };
  for (let atMs = 0; atMs < 100_000; atMs += 500) model.add(exchange(truth, atMs, { outMs: 0.05, backMs: 0.05 }));
  for (const hostMs of [0, 50_000, 100_000, 160_000]) expect(model.hostMsAt(model.controllerUsAt(hostMs)).ms).toBeCloseTo(hostMs, 2);
});

test('the stated uncertainty covers the truth (k = 2) in 181 to 200 of 200 trials', () => {
  let covered = 0;
  for (let seed = 1; seed <= 200; seed += 1) {
    const random = xoroshiro128plus(seed);
    const uniform = () => uniformFloat64(random);
    const truth = { offsetMs: 1e6 * uniform(), ratePpm: 200 * uniform() - 100 };
    const model = new ClockModel();
    // A steady delay that lies unevenly on the two ways, as of a USB adapter, and jitter.
    const [steadyMs, share] = [2 * uniform(), uniform()];
    for (let beat = 0; beat < 60; beat += 1) {
      model.add(
        exchange(truth, beat * 3000, { outMs: steadyMs * share + 3 * uniform() ** 4, backMs: steadyMs * (1 - share) + 3 * uniform() ** 4 }),
      );
    }
    const { ms, uMs } = model.offsetAt(180_000);
    if (Math.abs(ms - (controllerMs(truth, 180_000) - 180_000)) <= 2 * uMs) covered += 1;
  }
  expect(covered).toBeGreaterThanOrEqual(181);
});

test('a model that is asked far outside its data says that it knows less', () => {
  const model = new ClockModel();
  for (let atMs = 0; atMs < 20_000; atMs += 500) model.add(exchange({ offsetMs: 0, ratePpm: 10 }, atMs, { outMs: 0.2, backMs: 0.2 }));
  expect(model.offsetAt(3_620_000).uMs).toBeGreaterThan(3 * model.offsetAt(10_000).uMs);
});

test('what was known before a restart is forgotten', () => {
  const model = new ClockModel();
  model.add(exchange({ offsetMs: 5, ratePpm: 0 }, 0, { outMs: 0, backMs: 0 }));
  model.forget();
  expect(model.known).toBe(false);
  expect(model.offsetAt(0).uMs).toBe(1000);
});
