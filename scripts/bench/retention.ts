import { demoIds } from '@/db/demo/seed';
import { thinNext, wouldGo } from '@/server/store/thinning';
import { fill, intervalMs, startUtcMs } from './lib/filled-channel';
import { withDatabase } from './lib/fresh-database';
import { seedLab } from './lib/people';
import { sizesOf } from './lib/sizes';
import { growth, quantile, report } from './report';

/**
 * What it costs to thin old samples of channels with ever more of them: a step of the job, in which nobody adds to the channel, and the trial that tells what
 * would go. Neither may grow with what is stored; a step that did would make the whole job grow with its square.
 */

const sizes = sizesOf([100_000, 1_000_000, 10_000_000]);
const mostSteps = 20;
const { lab: labId, rig: rigId } = demoIds;

const milliseconds = async (work: () => Promise<unknown>) => {
  const start = performance.now();
  await work();
  return performance.now() - start;
};

async function run(): Promise<void> {
  await withDatabase(async (database) => {
    await seedLab(database);
    const { connection } = database;
    const steps: { size: number; cost: number }[] = [];
    for (const size of sizes) {
      const channel = { labId, rigId, channelId: await fill(database, size) };
      const endUtcMs = startUtcMs + size * intervalMs;
      const trial = await milliseconds(() => wouldGo(connection, channel, endUtcMs));
      const costs: number[] = [];
      let gone = 0;
      while (costs.length < mostSteps) {
        const start = performance.now();
        const took = await thinNext(connection, channel, { cutoffUtcMs: endUtcMs, nowUtcMs: endUtcMs });
        if (took === null) break;
        gone += took.samples;
        costs.push(performance.now() - start);
      }
      if (gone === 0) throw new Error('nothing was thinned');
      const value = quantile(costs, 0.95);
      steps.push({ size, cost: quantile(costs, 0.5) });
      report({ name: `retention ${String(size)}`, value, unit: 'ms a step p95', goal: 1000, want: 'at most', peer: null });
      report({ name: `retention trial ${String(size)}`, value: trial, unit: 'ms', goal: 2000, want: 'at most', peer: null });
    }
    report({ name: 'retention growth', value: growth(steps), unit: 'exponent', goal: 0.3, want: 'at most', peer: null });
  });
}

void run();
