import { parentPort } from 'node:worker_threads';
import { drawTrials, type TrialModel, type TrialSpan } from '@/shared/evaluation/monte-carlo';

/** A thread that draws its share of the Monte Carlo trials. */
parentPort?.on('message', ({ model, span }: { model: TrialModel; span: TrialSpan }) => {
  const values = drawTrials(model, span);
  parentPort?.postMessage(values, [values.buffer as ArrayBuffer]);
});
