import type { RunWrite } from './run-store';

/**
 * What a run wrote while the database was away, on this computer's disk. Its lines go into the database in the same order, and only
 * then are they removed here: a process that is killed meanwhile leaves them to the next one.
 */
export interface RunJournal {
  /**
   * Resolves when the write is safe on the disk.
   * @throws Error when the journal is full or the disk does not take it; nothing of this write is kept then
   */
  append(write: RunWrite): Promise<void>;
  /**
   * All that is kept, in order. A last line that was cut off by a crash was never confirmed and is left out.
   * @throws Error with a sentence where a line is not to be read by this version
   */
  read(): Promise<RunWrite[]>;
  /** Removes what is in the database now. */
  clear(): Promise<void>;
  /** Keeps what no longer fits the database under another name, for people. Returns where it lies now. */
  setAside(): Promise<string>;
}

export interface RunJournals {
  of(run: { rigId: string; runId: string }): RunJournal;
}
