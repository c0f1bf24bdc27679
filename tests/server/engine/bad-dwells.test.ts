import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { predictEquilibriumRad } from '@/shared/protocol/predict';
import { type Bench, brief, makeBench, runStart, startUtcMs } from './rig-bench';
import { readerOf } from './signals';

/** Dwells after which the run holds by itself: two without deflection, one after a swing that the pendulum did not answer, one that ends near the stops. */

const T = 420;
const start = (steps: Step[]) => runStart({ formatVersion: 1, name: 'Bad dwells', steps } satisfies ProtocolDocument);
const series: Step[] = [
  { kind: 'home' },
  { kind: 'swing', to: 'near' },
  ...Array.from({ length: 4 }, (_, index): Step[] => [
    { kind: 'dwell', for_s: 2 * T },
    { kind: 'swing', to: index % 2 === 0 ? 'far' : 'near' },
  ]).flat(),
];

async function running(at: (tS: number, bench: Bench) => number | null): Promise<Bench> {
  const bench: Bench = makeBench(
    start(series),
    readerOf(() => bench, [{ name: 'deflection', unit: 'rad', at: (tS) => at(tS, bench) }]),
  );
  bench.driver.start();
  await bench.pass(30);
  return bench;
}

/** A pseudo-random 5 µrad that is the same whenever a sample is read. */
const noise = (tS: number) => 5e-6 * Math.sin(12.9898 * tS * tS);
const facts = (bench: Bench) => bench.driver.facts();
const dwells = (bench: Bench) => brief(bench).filter((row) => row.startsWith('dwell'));

/** The exact answer of the demo rig's pendulum, as far as a test needs it: it swings about where it is pulled to. */
function answering(tS: number, bench: Bench): number {
  const swings = bench.store.log().filter(({ kind, endUtcMs }) => kind === 'swing' && endUtcMs !== null);
  let rad = predictEquilibriumRad(bench.start.rig, 0) ?? 0;
  const omega = (2 * Math.PI) / T;
  for (const { startUtcMs: beganUtcMs, angleStartDeg, angleEndDeg } of swings) {
    const since = tS - (beganUtcMs - startUtcMs) / 1000;
    if (since < 0) continue;
    const stepRad =
      (predictEquilibriumRad(bench.start.rig, angleEndDeg ?? 0) ?? 0) - (predictEquilibriumRad(bench.start.rig, angleStartDeg ?? 0) ?? 0);
    rad += stepRad * (1 - Math.exp((-Math.PI * since) / (8 * T)) * Math.cos(omega * since));
  }
  return rad + noise(tS);
}

test('two dwells without deflection hold the run, one does not; resumed it goes on until it is silent twice again', async () => {
  const bench = await running((tS, one) => (tS > 600 ? null : answering(tS, one)));
  await bench.pass(2 * T + 30);
  expect(facts(bench).state).toBe('running');
  await bench.pass(2 * T + 30);
  expect(facts(bench)).toMatchObject({ state: 'held', reasonCode: 'no-deflection' });
  expect(facts(bench).reason).toContain('silent in 2 dwells');
  expect(dwells(bench)).toEqual(['dwell done', 'dwell done']);
  expect(await bench.driver.resume('Ben')).toMatchObject({ ok: true });
  await bench.pass(2 * T + 60);
  expect(facts(bench).state).toBe('running');
  await bench.pass(2 * T + 60);
  expect(facts(bench)).toMatchObject({ state: 'held', reasonCode: 'no-deflection' });
  expect(dwells(bench)).toHaveLength(4);
});

test('a pendulum that does not answer the swing holds the run at the end of that dwell', async () => {
  const bench = await running((tS) => noise(tS));
  await bench.pass(2 * T + 30);
  expect(facts(bench)).toMatchObject({ state: 'held', reasonCode: 'no-response' });
  expect(facts(bench).reason).toMatch(
    /did not answer the swing: it swings by \d+ µrad, about \d+ µrad were to be expected.*may touch, or be caged/,
  );
  expect(brief(bench).at(-1)).toBe('dwell done');
  expect(await bench.driver.resume('Ben')).toMatchObject({ ok: true });
  await bench.pass(30);
  expect(brief(bench).at(-1)).toBe('dwell null');
});

test('one that answers goes on to the end', async () => {
  const bench = await running(answering);
  await bench.pass(9 * T + 200);
  expect(facts(bench).state).toBe('finished');
});

test('a pendulum that still swings out to nine tenths of its room at the end of a dwell holds the run: no next swing; a short knock does not', async () => {
  // The demo rig's readout ends at 30 mrad.
  const swinging = (amplitudeRad: number) => (tS: number, one: Bench) =>
    answering(tS, one) + amplitudeRad * Math.sin((2 * Math.PI * tS) / T);
  const bench = await running(swinging(27e-3));
  await bench.pass(2 * T + 30);
  expect(facts(bench)).toMatchObject({ state: 'held', reasonCode: 'excursion' });
  expect(facts(bench).reason).toMatch(/still swings out to (2[7-9]|3\d)\d{3} µrad at the end, and 30000 µrad.*stay where they are/);
  expect(brief(bench).at(-1)).toBe('dwell done');
  expect(bench.link.motions).toHaveLength(2);
  expect(await bench.driver.resume('Ben')).toMatchObject({ ok: true });
  await bench.pass(30);
  expect(brief(bench).at(-1)).toBe('dwell null');

  const knocked = await running((tS, one) => answering(tS, one) + (tS > 300 && tS < 320 ? 29e-3 : 0));
  await knocked.pass(2 * T + 60);
  expect(facts(knocked).state).toBe('running');
});
