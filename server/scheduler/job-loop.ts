import type { Logger } from 'pino';
import type { Cancel, Clock } from '../interfaces/clock';
import type { Job, JobQueue } from '../interfaces/jobs';

/** Works off a job; a rejection puts it back for a later attempt. */
export type JobHandler = (job: Job) => Promise<void>;

export interface JobLoop {
  start(): void;
  /** Looks at once instead of at the next tick. */
  poke(): void;
  /** Takes no more jobs and waits for the one at work. */
  stop(): Promise<void>;
  /** Resolves when no job is at work and none was due at the last look. */
  idle(): Promise<void>;
}

const lookEveryMs = 1_000;
const renewEveryMs = 10_000;

/** One worker in this process: takes due jobs one after another and renews their lease while they are at work. */
export function createJobLoop(parts: { queue: JobQueue; handlers: Readonly<Record<string, JobHandler>>; clock: Clock; log: Logger }): JobLoop {
  const { queue, handlers, clock, log } = parts;
  const kinds = Object.keys(handlers);
  let running = false;
  let atWork: Promise<void> | null = null;
  let again = false;
  let cancelLook: Cancel = () => undefined;

  async function work(job: Job): Promise<void> {
    let cancel: Cancel = () => undefined;
    const renew = () => {
      cancel = clock.after(renewEveryMs, () => {
        queue.renew(job).catch((error: unknown) => log.warn({ err: error, job: job.id }, 'the lease of a job could not be renewed'));
        renew();
      });
    };
    renew();
    try {
      await handlers[job.kind]?.(job);
      await queue.finish(job);
    } catch (error) {
      log.error({ err: error, job: job.id, kind: job.kind, attempt: job.attempt }, 'a job failed');
      await queue.fail(job, error instanceof Error ? error.message : String(error));
    } finally {
      cancel();
    }
  }

  async function takeAll(): Promise<void> {
    try {
      do {
        again = false;
        for (let job = await queue.take(kinds); running && job !== null; job = await queue.take(kinds)) await work(job);
      } while (again && running);
    } catch (error) {
      log.warn({ err: error }, 'the jobs cannot be looked at');
    } finally {
      atWork = null;
    }
  }

  function look(): void {
    if (!running) return;
    if (atWork === null) atWork = takeAll();
    else again = true;
  }

  function lookRegularly(): void {
    look();
    cancelLook = clock.after(lookEveryMs, lookRegularly);
  }

  return {
    start: () => {
      if (running) return;
      running = true;
      lookRegularly();
    },
    poke: look,
    stop: async () => {
      running = false;
      cancelLook();
      await atWork;
    },
    idle: async () => {
      while (atWork !== null) await atWork;
    },
  };
}
