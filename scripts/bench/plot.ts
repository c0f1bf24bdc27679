import { demoIds } from '@/db/demo/seed';
import { countSamples, extremesOf } from '@/server/store/sample-summaries';
import { fill, intervalMs, startUtcMs } from './lib/filled-channel';
import { withDatabase, type BenchDatabase } from './lib/fresh-database';
import { seedLab } from './lib/people';
import { sizesOf } from './lib/sizes';
import { growth, quantile, report } from './report';

/**
 * What the server does for one view of a plot of 4000 points, of channels at 10 Hz with ever more samples: the whole of it and parts down to a thousandth,
 * anywhere. The peer is the same out of the samples themselves, for the whole of the smallest channel.
 */

const sizes = sizesOf([100_000, 1_000_000, 10_000_000]);
const mostPoints = 4000;
const parts = [1, 0.3, 0.1, 0.03, 0.01, 0.001];
const viewsOfAPart = 12;
const { lab: labId } = demoIds;

type View = { labId: string; channelId: string; fromUtcMs: number; toUtcMs: number };

const milliseconds = async (work: () => Promise<unknown>) => {
  const start = performance.now();
  await work();
  return performance.now() - start;
};

async function show({ connection }: BenchDatabase, view: View): Promise<void> {
  const total = await countSamples(connection, view);
  const { value } = await extremesOf(connection, view, { cells: mostPoints / 2, total });
  if (value.length > mostPoints) throw new Error(`a view has ${String(value.length)} points`);
}

/** Views of each part, evenly over the whole. */
function* viewsOf(channelId: string, size: number): Generator<View> {
  const spanMs = size * intervalMs;
  for (const part of parts)
    for (let number = 0; number < viewsOfAPart; number += 1) {
      const fromUtcMs = startUtcMs + ((1 - part) * spanMs * number) / (viewsOfAPart - 1) + 0.123;
      yield { labId, channelId, fromUtcMs, toUtcMs: fromUtcMs + part * spanMs };
    }
}

async function run(): Promise<void> {
  await withDatabase(async (database) => {
    await seedLab(database);
    const points: { size: number; cost: number }[] = [];
    let peer: number | null = null;
    for (const size of sizes) {
      const channelId = await fill(database, size);
      const whole: View = { labId, channelId, fromUtcMs: startUtcMs, toUtcMs: startUtcMs + size * intervalMs };
      const raw = () => extremesOf(database.connection, whole, { cells: mostPoints / 2, total: 0 });
      if (size === sizes[0]) peer = Math.min(await milliseconds(raw), await milliseconds(raw));
      await show(database, whole);
      const costs: number[] = [];
      for (const view of viewsOf(channelId, size)) costs.push(await milliseconds(() => show(database, view)));
      const value = quantile(costs, 0.95);
      points.push({ size, cost: value });
      report({ name: `plot ${String(size)}`, value, unit: 'ms p95', goal: 200, want: 'at most', peer });
    }
    report({ name: 'plot growth', value: growth(points), unit: 'exponent', goal: 0.3, want: 'at most', peer: null });
  });
}

void run();
