import type { Logger } from 'pino';
import type { Clock } from '../interfaces/clock';
import type { Job, JobHandlers, JobQueue } from '../interfaces/jobs';
import { startJobWorker, type JobWorker } from '../scheduler/job-worker';

/** Counts what a queue's worker has in hand, so that somebody can wait until it has nothing. */
class Watched implements JobQueue {
  private busy = 0;
  private readonly waiting: (() => void)[] = [];

  constructor(private readonly queue: JobQueue) {}

  async take(kinds: readonly string[]): Promise<Job | null> {
    this.busy += 1;
    try {
      const job = await this.queue.take(kinds);
      if (job === null) this.done();
      return job;
    } catch (error) {
      this.done();
      throw error;
    }
  }

  renew(job: Job): Promise<boolean> {
    return this.queue.renew(job);
  }

  finish(job: Job): Promise<void> {
    return this.queue.finish(job).finally(() => this.done());
  }

  fail(job: Job, why: string): Promise<void> {
    return this.queue.fail(job, why).finally(() => this.done());
  }

  giveBack(job: Job): Promise<void> {
    return this.queue.giveBack(job).finally(() => this.done());
  }

  idle(): Promise<void> {
    return this.busy === 0 ? Promise.resolve() : new Promise((resolve) => this.waiting.push(resolve));
  }

  private done(): void {
    this.busy -= 1;
    if (this.busy === 0) for (const resolve of this.waiting.splice(0)) resolve();
  }
}

interface CrewParts {
  clock: Clock;
  log: Logger;
  /** How long a worker that found nothing waits before it looks again. */
  pollMs: number;
  /** A queue of its own for each worker. */
  queueFor(name: string): JobQueue;
  /** Kinds of work that must not wait for each other, each with its handlers. */
  crews: Readonly<Record<string, JobHandlers>>;
}

/** The workers of this process: one for each group of kinds. */
export class JobCrew {
  private workers: { worker: JobWorker; queue: Watched }[] = [];
  private ending = false;

  constructor(private readonly parts: CrewParts) {}

  start(): void {
    const { clock, log, pollMs, crews, queueFor } = this.parts;
    this.workers = Object.entries(crews).map(([name, handlers]) => {
      const queue = new Watched(queueFor(name));
      const onProblem = ({ job, error }: { job: Job | null; error: unknown }) => {
        const about = { job: job?.id ?? null, kind: job?.kind ?? null };
        if (this.ending) log.info(about, 'a job was cut short by the end of the server; the next one takes it up again');
        else log.error({ err: error as Error, ...about }, 'a job failed');
      };
      return { queue, worker: startJobWorker({ queue, clock, handlers, pollMs, onProblem }) };
    });
  }

  poke(): void {
    for (const { worker } of this.workers) worker.wake();
  }

  async idle(): Promise<void> {
    await Promise.all(this.workers.map(({ queue }) => queue.idle()));
  }

  /** No new jobs; resolves when those in hand are over, done or cut short. */
  async stop(): Promise<void> {
    this.ending = true;
    await Promise.all(this.workers.map(({ worker }) => worker.stop()));
  }
}
