import { parentPort } from 'node:worker_threads';
import type { HeavyTasks } from '../interfaces/heavy-tasks';
import { heavyTasks } from './heavy-tasks';

/** What the main thread sends: one call of a heavy task. */
export interface WorkerCall {
  id: number;
  task: keyof HeavyTasks;
  args: unknown[];
}

export type WorkerAnswer =
  { id: number; value: unknown } | { id: number; error: { name: string; message: string; code: string | null; stack: string } };

parentPort?.on('message', (call: WorkerCall) => {
  const task = heavyTasks[call.task] as (...args: unknown[]) => Promise<unknown>;
  task(...call.args).then(
    (value) => parentPort?.postMessage({ id: call.id, value } satisfies WorkerAnswer),
    (error: unknown) => parentPort?.postMessage({ id: call.id, error: plainError(error) } satisfies WorkerAnswer),
  );
});

function plainError(error: unknown): { name: string; message: string; code: string | null; stack: string } {
  if (!(error instanceof Error)) return { name: 'Error', message: String(error), code: null, stack: '' };
  const code = 'code' in error && typeof error.code === 'string' ? error.code : null;
  return { name: error.constructor.name, message: error.message, code, stack: error.stack ?? '' };
}
