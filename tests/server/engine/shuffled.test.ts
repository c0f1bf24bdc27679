import type { RepeatStep, Step } from '@/shared/protocol/document';
import { planTimeline } from '@/shared/protocol/timeline';
import { type Bench, makeBench, runStart } from './rig-bench';

/** A run whose protocol draws the order of its blocks: planned in the log before it begins, and the same after a restart. */

const block = (...to: string[]): RepeatStep => ({
  kind: 'repeat',
  times: 1,
  steps: to.flatMap((station): Step[] => [
    { kind: 'swing', to: station },
    { kind: 'dwell', for_s: 20 },
  ]),
});
const protocol = {
  formatVersion: 1 as const,
  name: 'Blocks',
  onInterruption: 'resume' as const,
  steps: [
    { kind: 'home' as const },
    { kind: 'repeat' as const, times: 4, order: 'shuffled' as const, steps: [block('near', 'far'), block('clear'), block('far', 'near')] },
  ],
};
const begin = (shuffleSeed: number): Bench => {
  const bench = makeBench(runStart(protocol, { shuffleSeed }));
  bench.driver.start();
  return bench;
};
const pathsOf = (bench: Bench) => bench.store.log().map(({ path }) => path);
const planned = (bench: Bench) => planTimeline(bench.start, { utcMs: 0, angleDeg: 0 }).items.map(({ path }) => path);

test('the order of each pass is in the log before anything of it is ordered, and is what then happens', async () => {
  const bench = begin(11);
  await bench.pass(1_500);
  expect(bench.driver.facts().state).toBe('finished');
  expect(pathsOf(bench)).toEqual(planned(bench));
  const { events } = bench.store;
  expect(events.find(({ kind }) => kind === 'run-started')?.data).toMatchObject({ shuffleSeed: 11 });
  const told = events.filter(({ kind }) => kind === 'order-drawn');
  expect(told.map(({ data }) => data['path'])).toEqual([1, 2, 3, 4].map((pass) => `2.repeat[${pass}]`));
  expect(new Set(told.map(({ data }) => String(data['order']))).size).toBeGreaterThan(1);
  for (const { seq, data } of told) {
    const first = events.find(({ kind, data: of }) => kind === 'step-began' && String(of['path']).startsWith(`${String(data['path'])}.`));
    expect(first?.seq).toBeGreaterThan(seq);
    expect(String(first?.data['path'])).toContain(`${String(data['path'])}.${String((data['order'] as number[])[0])}.repeat`);
  }
});

test('a run that is taken up again, at any moment of it, goes on in the order that was drawn, and tells of no pass twice', async () => {
  for (const atS of [35, 58.7, 90, 131]) {
    const bench = begin(11);
    await bench.pass(atS);
    await bench.restart(5);
    await bench.pass(2_000);
    expect(bench.driver.facts().state).toBe('finished');
    expect([...new Set(pathsOf(bench))]).toEqual(planned(bench));
    const told = bench.store.events.filter(({ kind }) => kind === 'order-drawn').map(({ data }) => data['path']);
    expect(told).toEqual([...new Set(told)]);
    expect(told).toHaveLength(4);
  }
});

test('passes of marks alone, begun together before a swing that is sent ahead, are told once each', async () => {
  const marks = ['a', 'b'].map((label): RepeatStep => ({ kind: 'repeat', times: 1, steps: [{ kind: 'mark', label }] }));
  const steps: Step[] = [
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    { kind: 'dwell', for_s: 20 },
    { kind: 'repeat', times: 10, order: 'shuffled', steps: marks },
    { kind: 'swing', to: 'far' },
  ];
  const bench = makeBench(runStart({ ...protocol, steps }, { shuffleSeed: 11 }));
  bench.driver.start();
  await bench.pass(500);
  expect(bench.driver.facts().state).toBe('finished');
  const told = bench.store.events.filter(({ kind }) => kind === 'order-drawn').map(({ data }) => data['path']);
  expect(told).toEqual(Array.from({ length: 10 }, (_, pass) => `4.repeat[${pass + 1}]`));
});
