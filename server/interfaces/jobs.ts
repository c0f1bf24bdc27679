/** A piece of work somebody holds the lease of. */
export interface Job {
  id: string;
  labId: string | null;
  kind: string;
  payload: unknown;
  /** This attempt, from 1: with the id it is the proof of the lease. */
  attempt: number;
  maxAttempts: number;
}

/** Work that survives a crash: whoever takes a job holds it for 30 s and renews; a lapsed lease lets another take it. */
export interface JobQueue {
  /** The next job that is due of one of these kinds, or null. */
  take(kinds: readonly string[]): Promise<Job | null>;
  /** Moves the end of the lease on; false: the lease was lost and the work must be dropped. */
  renew(job: Job): Promise<boolean>;
  finish(job: Job): Promise<void>;
  /** Puts the job back for a later attempt, or gives it up after the last one. */
  fail(job: Job, why: string): Promise<void>;
  /** Puts the job back at once, as if this attempt had not been: it was cut short by the end of the process. */
  giveBack(job: Job): Promise<void>;
}

/** The process ends before the work does; the work is not at fault. */
export class CutShort extends Error {
  constructor() {
    super('the server is ending');
  }
}

/** Does the work of one kind of job; a rejection puts the job back or gives it up. */
export type JobHandler = (job: Job) => Promise<void>;
export type JobHandlers = Readonly<Record<string, JobHandler>>;
