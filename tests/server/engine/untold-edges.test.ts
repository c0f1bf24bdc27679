import type { ProtocolDocument } from '@/shared/protocol/document';
import { makeBench, runStart, shortProtocol, startUtcMs, type Bench } from './rig-bench';

/** Start and end of a motion in the step log are the controller's own edges; where one was never told, the row and the log say so. */

/** Of a clock model in order, s. */
const MEASURED_U_S = 0.0002;
const notTold = (bench: Bench) => bench.store.events.filter(({ kind }) => kind === 'edge-not-told').map(({ data }) => data);
const swings = (bench: Bench) => bench.store.log().filter(({ kind }) => kind === 'swing');
/** When the controller truly began its motions: home, near, and so on. */
const began = (bench: Bench, number: number) => bench.link.motions[number]?.beganUtcMs ?? NaN;

/** Home, near at once, a minute, then to the middle: a timed swing of 6.4 s. */
const toTheMiddle: ProtocolDocument = {
  ...shortProtocol,
  steps: [
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    { kind: 'dwell', for_s: 60 },
    { kind: 'swing', to: 'inline' },
    { kind: 'dwell', for_s: 30 },
  ],
};

/** A run up to `secondsBefore` the beginning of its timed swing. */
async function beforeSwing(secondsBefore: number, protocol: ProtocolDocument = toTheMiddle): Promise<Bench> {
  const bench = makeBench(runStart(protocol));
  bench.driver.start();
  await bench.pass(200, () => bench.store.log().at(-1)?.kind === 'dwell');
  const endUtcMs = bench.store.log().at(-1)?.plannedEndUtcMs ?? NaN;
  await bench.pass((endUtcMs - bench.clock.utcMs()) / 1000 - secondsBefore);
  return bench;
}

test('an edge whose line was lost is read again from the ring and has its own time', async () => {
  const bench = await beforeSwing(0.5);
  bench.link.drop(1_500);
  await bench.pass(300);
  expect(bench.driver.facts().state).toBe('finished');
  expect(swings(bench)[1]).toMatchObject({ startUtcMs: began(bench, 2), uStartS: MEASURED_U_S, uEndS: MEASURED_U_S, outcome: 'done' });
  expect(notTold(bench)).toEqual([]);
});

test('a beginning that is lost for good is not passed off as measured when the end is told', async () => {
  const bench = await beforeSwing(1);
  bench.link.loses = ['motion-began'];
  await bench.pass(300);
  expect(bench.driver.facts().state).toBe('finished');
  const [, row] = swings(bench);
  expect(notTold(bench)).toEqual([{ seq: row?.seq, path: row?.path, edge: 'began', spanS: expect.any(Number) }]);
  // It cannot have begun before its time, nor so late that the profile had no room before the end that was told.
  expect(Math.abs((row?.startUtcMs ?? NaN) - began(bench, 2)) / 1000).toBeLessThanOrEqual(2 * (row?.uStartS ?? NaN));
  expect(row).toMatchObject({ outcome: 'done', uEndS: MEASURED_U_S });
});

test('edges that passed while the server was away are read again from the ring, with the controller’s own stamps', async () => {
  const bench = await beforeSwing(1, { ...toTheMiddle, onInterruption: 'resume' });
  await bench.restart(8);
  await bench.pass(300);
  expect(bench.driver.facts().state).toBe('finished');
  const [, row] = swings(bench);
  const leaseLapsedUtcMs = row?.endUtcMs ?? NaN;
  expect(row).toMatchObject({ outcome: 'cut short', startUtcMs: began(bench, 2), uStartS: MEASURED_U_S, uEndS: MEASURED_U_S });
  expect(leaseLapsedUtcMs - began(bench, 2)).toBeGreaterThan(0);
  expect(leaseLapsedUtcMs - began(bench, 2)).toBeLessThan(2_000);
  expect(notTold(bench)).toEqual([]);
});

test('a beginning that nobody heard, and that has left the ring, has an uncertainty as long as the server was away', async () => {
  const bench = await beforeSwing(1, { ...toTheMiddle, onInterruption: 'resume' });
  bench.link.loses = ['motion-began', 'motion-ended'];
  await bench.restart(8);
  await bench.pass(1);
  bench.link.loses = [];
  await bench.pass(300);
  expect(bench.driver.facts().state).toBe('finished');
  const [, row] = swings(bench);
  expect(row).toMatchObject({ outcome: 'cut short', startUtcMs: began(bench, 2) });
  // Somewhere in the 7 s after its time: 7 / √3 s (GUM 4.3.7, a rectangle that begins at the estimate).
  expect(row?.uStartS).toBeGreaterThan(7 / Math.sqrt(3) - 0.1);
  expect(notTold(bench)).toContainEqual({ seq: row?.seq, path: row?.path, edge: 'began', spanS: expect.any(Number) });
});

test('an end that is lost for good lies between the profile and the standstill, and says so', async () => {
  const bench = await beforeSwing(1);
  bench.link.loses = ['motion-ended'];
  await bench.pass(120);
  expect(bench.driver.facts().state).toBe('held');
  const [, row] = swings(bench);
  // 20.18° at 6°/s and 2°/s²: 20.18 / 6 + 6 / 2 s.
  const trueEndUtcMs = began(bench, 2) + 1000 * (20.18 / 6 + 3);
  expect(row).toMatchObject({ outcome: 'done' });
  expect(row?.endUtcMs).toBeCloseTo(trueEndUtcMs, 0);
  // The link's grace of 15 s passed before the table was asked to stand still: 15 / √3 s.
  expect(row?.uEndS).toBeGreaterThan(15 / Math.sqrt(3) - 0.1);
  expect(notTold(bench)).toEqual([{ seq: row?.seq, path: row?.path, edge: 'ended', spanS: expect.any(Number) }]);
});

test('a move that was cancelled before its time has no beginning to be told of', async () => {
  const bench = await beforeSwing(1);
  bench.driver.hold('Ben');
  await bench.pass(60);
  expect(bench.driver.facts().state).toBe('held');
  expect(bench.clock.utcMs()).toBeGreaterThan(startUtcMs);
  expect(notTold(bench)).toEqual([]);
});
