import { availableParallelism } from 'node:os';
import { Worker } from 'node:worker_threads';
import { blocksOf, drawTrials, summarised, trialsPerBlock, type MonteCarloResult, type TrialModel } from '@/shared/evaluation/monte-carlo';
import { threadOf } from './worker-tasks';

/** Fewer trials are done sooner than a thread has begun. */
const worthThreads = 200_000;
const mostThreads = 4;

/** Threads for the Monte Carlo trials of one evaluation; begun early, they load while the archive is read. */
export interface TrialCrew {
  /** The same numbers, however many threads draw them. */
  run(model: TrialModel): Promise<MonteCarloResult | null>;
  close(): Promise<void>;
}

export function createTrialCrew(trials: number): TrialCrew {
  const helpers = trials < worthThreads ? 0 : Math.min(mostThreads, availableParallelism()) - 1;
  const workers = Array.from({ length: helpers }, () => new Worker(threadOf('trials-worker'), { eval: true, execArgv: [] }));
  const blocks = blocksOf(trials);
  const share = Math.ceil(blocks / (helpers + 1));
  return {
    async run(model) {
      if (trials === 0) return null;
      const values = new Float64Array(trials);
      const helped = workers.map(async (worker, k) => {
        const [fromBlock, toBlock] = [Math.min(blocks, (k + 1) * share), Math.min(blocks, (k + 2) * share)];
        if (fromBlock < toBlock)
          values.set(await drawnBy(worker, { model, span: { trials, fromBlock, toBlock } }), fromBlock * trialsPerBlock);
      });
      values.set(drawTrials(model, { trials, fromBlock: 0, toBlock: Math.min(blocks, share) }), 0);
      await Promise.all(helped);
      return summarised(values, model.inputs);
    },
    async close() {
      await Promise.all(workers.map((worker) => worker.terminate()));
    },
  };
}

function drawnBy(
  worker: Worker,
  task: { model: TrialModel; span: { trials: number; fromBlock: number; toBlock: number } },
): Promise<Float64Array> {
  return new Promise((resolve, reject) => {
    worker.once('message', resolve);
    worker.once('error', reject);
    worker.postMessage(task);
  });
}
