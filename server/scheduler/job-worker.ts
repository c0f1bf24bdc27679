import type { Cancel, Clock } from '../interfaces/clock';
import { CutShort, type Job, type JobHandlers, type JobQueue } from '../interfaces/jobs';

/** A third of the lease, so that two renewals may be late before it lapses. */
const renewEveryMs = 10_000;

export interface JobWorkerParts {
  queue: JobQueue;
  clock: Pick<Clock, 'after'>;
  handlers: JobHandlers;
  /** How long to wait before asking again when nothing was due. */
  pollMs?: number;
  /** Told when a job failed or the queue itself could not be reached. */
  onProblem(problem: { job: Job | null; error: unknown }): void;
}

export interface JobWorker {
  /** Looks at once instead of at the next poll. */
  wake(): void;
  /** Takes no further job and resolves when the present one has ended. */
  stop(): Promise<void>;
}

/** Works jobs off one after another until stopped. */
export function startJobWorker(parts: JobWorkerParts): JobWorker {
  const { clock, pollMs = 1000 } = parts;
  let stopped = false;
  let cancelWait: Cancel | null = null;
  let endWait = (): void => undefined;
  const wait = () =>
    new Promise<void>((resolve) => {
      endWait = () => {
        cancelWait?.();
        resolve();
      };
      cancelWait = clock.after(pollMs, resolve);
    });
  const loop = async () => {
    while (!stopped) if (!(await workOnce(parts))) await (stopped ? Promise.resolve() : wait());
  };
  const ended = loop();
  return {
    wake: () => endWait(),
    stop: () => {
      stopped = true;
      endWait();
      return ended;
    },
  };
}

/** True when there was a job. */
async function workOnce({ queue, clock, handlers, onProblem }: JobWorkerParts): Promise<boolean> {
  let job: Job | null = null;
  try {
    job = await queue.take(Object.keys(handlers));
    if (job === null) return false;
    const held = job;
    const endRenewal = keepRenewing(clock, () => queue.renew(held));
    try {
      await handlers[held.kind]?.(held);
    } finally {
      endRenewal();
    }
    await queue.finish(held);
    return true;
  } catch (error) {
    onProblem({ job, error });
    if (job === null) return false;
    const failed = job;
    const put =
      error instanceof CutShort ? queue.giveBack(failed) : queue.fail(failed, error instanceof Error ? error.message : String(error));
    await put.catch((failure: unknown) => onProblem({ job: failed, error: failure }));
    return true;
  }
}

function keepRenewing(clock: Pick<Clock, 'after'>, renew: () => Promise<boolean>): Cancel {
  let ended = false;
  let cancel: Cancel = () => undefined;
  const next = () => {
    cancel = clock.after(renewEveryMs, () => {
      // A renewal that fails is tried again at the next turn; if all fail the lease lapses and the attempt's number fences this worker off.
      void renew()
        .catch(() => true)
        .then((held) => {
          if (held && !ended) next();
        });
    });
  };
  next();
  return () => {
    ended = true;
    cancel();
  };
}
