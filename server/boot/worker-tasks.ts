import { join } from 'node:path';
import { Worker } from 'node:worker_threads';
import { CutShort } from '../interfaces/jobs';
import type { HeavyTasks } from '../interfaces/heavy-tasks';
import type { WorkerAnswer, WorkerCall } from './worker-thread';

/**
 * What a thread runs to load a file of this folder. Of a built server its file beside this one is loaded; otherwise the thread itself brings TypeScript in, since
 * Node 20 carries no loader hooks into a thread.
 */
export const threadOf = (name: string): string =>
  __filename.endsWith('.ts')
    ? `require('tsx/cjs'); require(${JSON.stringify(join(__dirname, `${name}.ts`))});`
    : `process.setSourceMapsEnabled(true); require(${JSON.stringify(join(__filename, '..', `${name}.js`))});`;

interface Pending {
  resolve(value: unknown): void;
  reject(error: Error): void;
}

/** A worker thread that takes calls, begun at the first and begun anew after it broke. */
class Lane {
  private worker: Worker | null = null;
  private readonly pending = new Map<number, Pending>();
  private count = 0;
  private closed = false;

  call(task: WorkerCall['task'], args: unknown[]): Promise<unknown> {
    if (this.closed) return Promise.reject(new CutShort());
    const worker = (this.worker ??= this.begin());
    const id = (this.count += 1);
    return new Promise((resolve, reject) => {
      this.pending.set(id, { resolve, reject });
      worker.postMessage({ id, task, args } satisfies WorkerCall);
    });
  }

  async close(): Promise<void> {
    this.closed = true;
    await this.worker?.terminate();
  }

  private begin(): Worker {
    const worker = new Worker(threadOf('worker-thread'), { eval: true, execArgv: [] });
    worker.unref();
    worker.on('message', (answer: WorkerAnswer) => this.answered(answer));
    worker.on('error', (error: Error) => this.broken(worker, error));
    worker.on('exit', () =>
      this.broken(worker, this.closed ? new CutShort() : new Error('the worker thread ended before it had answered')),
    );
    return worker;
  }

  private answered(answer: WorkerAnswer): void {
    const pending = this.pending.get(answer.id);
    this.pending.delete(answer.id);
    if ('value' in answer) pending?.resolve(answer.value);
    else pending?.reject(Object.assign(new Error(answer.error.message), answer.error));
  }

  private broken(worker: Worker, error: Error): void {
    if (this.worker !== worker) return;
    this.worker = null;
    for (const pending of this.pending.values()) pending.reject(error);
    this.pending.clear();
  }
}

/** The heavy tasks in two threads: one for jobs, one for downloads, which somebody waits for. */
export function createWorkerTasks(): HeavyTasks & { close(): Promise<void> } {
  const jobs = new Lane();
  const downloads = new Lane();
  const on = <K extends keyof HeavyTasks>(lane: Lane, task: K) =>
    ((...args: unknown[]) => lane.call(task, args)) as unknown as HeavyTasks[K];
  return {
    rehearse: on(jobs, 'rehearse'),
    evaluate: on(jobs, 'evaluate'),
    zipArchive: on(downloads, 'zipArchive'),
    report: on(downloads, 'report'),
    close: async () => {
      await Promise.all([jobs.close(), downloads.close()]);
    },
  };
}
