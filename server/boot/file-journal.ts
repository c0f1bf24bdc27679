import { mkdir, open, readFile, rename, rm, type FileHandle } from 'node:fs/promises';
import { join } from 'node:path';
import * as z from 'zod';
import type { RunJournal, RunJournals } from '../interfaces/run-journal';
import type { RunWrite } from '../interfaces/run-store';

/** Raised whenever the shape of a line changes. */
const LINE_VERSION = 1;
/** A night without a database is some thousand lines of a few kilobytes. */
const LONGEST_BYTES = 64 * 1_048_576;

const lineSchema = z.object({
  journal: z.literal(LINE_VERSION),
  write: z.object({
    labId: z.string(),
    runId: z.string(),
    expectedSeq: z.number().int(),
    snapshot: z.unknown(),
    chartVersion: z.number().int(),
    steps: z.array(z.looseObject({ seq: z.number().int() })),
    events: z.array(z.looseObject({ seq: z.number().int(), hash: z.string() })),
    summary: z.looseObject({ state: z.string() }),
  }),
});

/** Journals as files of the state folder, one for each run, a line of JSON for each write, on the disk before it counts. */
export class FileJournals implements RunJournals {
  constructor(
    private readonly folder: string,
    private readonly longestBytes = LONGEST_BYTES,
  ) {}

  of({ rigId, runId }: { rigId: string; runId: string }): RunJournal {
    const name = `${rigId}.${runId}`.replaceAll(/[^\w.-]/g, '');
    return new FileJournal(this.folder, `${name}.jsonl`, this.longestBytes);
  }
}

class FileJournal implements RunJournal {
  private readonly path: string;
  /** One thing after the other. */
  private last: Promise<unknown> = Promise.resolve();

  constructor(
    private readonly folder: string,
    private readonly name: string,
    private readonly longestBytes: number,
  ) {
    this.path = join(folder, name);
  }

  append(write: RunWrite): Promise<void> {
    return this.inTurn(() => this.appendNow(Buffer.from(`${JSON.stringify({ journal: LINE_VERSION, write })}\n`)));
  }

  read(): Promise<RunWrite[]> {
    return this.inTurn(async () => {
      const text = await readFile(this.path, 'utf8').catch((error: NodeJS.ErrnoException) => {
        if (error.code === 'ENOENT') return '';
        throw error;
      });
      const lines = text.split('\n');
      // What follows the last line end was cut off by a crash, before anybody counted on it.
      return lines.slice(0, -1).map((line, index) => this.parsed(line, index + 1));
    });
  }

  clear(): Promise<void> {
    return this.inTurn(async () => {
      await rm(this.path, { force: true });
      await this.syncFolder();
    });
  }

  setAside(): Promise<string> {
    return this.inTurn(async () => {
      const aside = `${this.path}.left`;
      await rename(this.path, aside);
      await this.syncFolder();
      return aside;
    });
  }

  /** Opened anew for each line: lines are few, and nothing stays open when the process lets go of the run. */
  private async appendNow(line: Buffer): Promise<void> {
    await mkdir(this.folder, { recursive: true });
    const file = await open(this.path, 'a');
    try {
      const { size } = await file.stat();
      if (size + line.length > this.longestBytes)
        throw new Error(`${this.path} is full: it holds ${size} bytes, and ${this.longestBytes} are the most it may.`);
      await appendWhole(file, line, size);
      if (size === 0) await this.syncFolder();
    } finally {
      await file.close();
    }
  }

  private parsed(line: string, number: number): RunWrite {
    try {
      return lineSchema.parse(JSON.parse(line)).write as unknown as RunWrite;
    } catch {
      throw new Error(
        `Line ${number} of ${this.path} is no journal line of version ${LINE_VERSION}. It holds what the run wrote while the database was away; start the version of the server that wrote it, or move the file away.`,
      );
    }
  }

  /** A new name in a folder outlives a power cut only when the folder itself was written. */
  private async syncFolder(): Promise<void> {
    const folder = await open(this.folder, 'r').catch(() => null);
    await folder?.sync().finally(() => folder.close());
  }

  private inTurn<T>(deed: () => Promise<T>): Promise<T> {
    const turn = this.last.then(deed, deed);
    this.last = turn.catch(() => undefined);
    return turn;
  }
}

/** Half a line must not stand before the next one. */
async function appendWhole(file: FileHandle, line: Buffer, size: number): Promise<void> {
  try {
    await file.appendFile(line);
    await file.datasync();
  } catch (error) {
    await file.truncate(size).catch(() => undefined);
    throw error;
  }
}
