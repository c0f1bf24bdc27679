import { mkdirSync, readdirSync, readFileSync, readlinkSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import * as z from 'zod';

const markSchema = z.strictObject({
  /** Of the machine's start: another one, or another machine, tells nothing of a process here. */
  bootId: z.string(),
  /** Of the processes that see each other; a container has one of its own. */
  namespace: z.string(),
  pid: z.number().int(),
  /** When the process began, in the kernel's ticks since the machine's start: numbers of processes are given again. */
  startTicks: z.string(),
});
export type ProcessMark = z.infer<typeof markSchema>;

/** What the kernel tells of processes. */
export interface ProcessTable {
  /** Null where nothing can be told for sure. */
  own(): ProcessMark | null;
  /**
   * When the process with this number began; null: there is none, or it has ended and is not buried yet.
   * @throws where that could not be found out
   */
  startTicksOf(pid: number): string | null;
}

const oldMs = 86_400_000;

/**
 * Which process has which name on the leases of rigs, one small file each in the state folder: the next server can tell for sure that a
 * killed one is gone, and need not wait for the end of its leases. Wherever that is not sure (another machine, another container, no file)
 * a name counts as alive, and so it does where the disk is full or nothing can be read: a server starts without marks too.
 */
export class ProcessMarks {
  constructor(
    private readonly folder: string,
    private readonly onError: (error: unknown) => void,
    private readonly table: ProcessTable = linuxProcesses,
  ) {}

  /** Writes down that this process is `name`. Marks that are a day old and of no process that is known to live are swept out. */
  leave(name: string, nowUtcMs: number): void {
    try {
      mkdirSync(this.folder, { recursive: true });
      this.sweep(nowUtcMs);
      const own = this.table.own();
      if (own !== null) writeFileSync(this.path(name), JSON.stringify(own), { mode: 0o600 });
    } catch (error) {
      this.onError(error);
    }
  }

  /** Whether the process of that name ran here and has ended, without any doubt. */
  isGone(name: string): boolean {
    const mark = this.read(this.path(name));
    try {
      return mark !== null && this.isOfHere(mark) && this.table.startTicksOf(mark.pid) !== mark.startTicks;
    } catch (error) {
      this.onError(error);
      return false;
    }
  }

  forget(name: string): void {
    try {
      rmSync(this.path(name), { force: true });
    } catch (error) {
      this.onError(error);
    }
  }

  private sweep(nowUtcMs: number): void {
    for (const file of readdirSync(this.folder)) {
      const path = join(this.folder, file);
      const old = nowUtcMs - (statSync(path, { throwIfNoEntry: false })?.mtimeMs ?? nowUtcMs) > oldMs;
      const mark = this.read(path);
      const ofHere = mark !== null && this.isOfHere(mark);
      if (old && (!ofHere || this.isGone(file.replace(/\.json$/, '')))) rmSync(path, { force: true });
    }
  }

  private isOfHere({ bootId, namespace }: ProcessMark): boolean {
    const own = this.table.own();
    return own !== null && own.bootId === bootId && own.namespace === namespace;
  }

  private read(path: string): ProcessMark | null {
    try {
      return markSchema.parse(JSON.parse(readFileSync(path, 'utf8')));
    } catch {
      return null;
    }
  }

  private path(name: string): string {
    return join(this.folder, `${name.replaceAll(/[^\w-]/g, '')}.json`);
  }
}

/** Fields of `/proc/PID/stat` after the name in brackets, which may hold anything (proc(5)): state is the first, start time the 20th. */
const [STATE, START_TICKS] = [0, 19];

const linuxProcesses: ProcessTable = {
  own() {
    try {
      const startTicks = linuxProcesses.startTicksOf(process.pid);
      if (startTicks === null) return null;
      const bootId = readFileSync('/proc/sys/kernel/random/boot_id', 'utf8').trim();
      return { bootId, namespace: readlinkSync('/proc/self/ns/pid'), pid: process.pid, startTicks };
    } catch {
      return null;
    }
  },
  startTicksOf(pid) {
    try {
      const stat = readFileSync(`/proc/${String(pid)}/stat`, 'utf8');
      const fields = stat.slice(stat.lastIndexOf(')') + 2).split(' ');
      return fields[STATE] === 'Z' || fields[STATE] === 'X' ? null : (fields[START_TICKS] ?? null);
    } catch (error) {
      // No such process (proc(5)). Anything else, too many open files say, tells nothing of it.
      if (error instanceof Error && 'code' in error && (error.code === 'ENOENT' || error.code === 'ESRCH')) return null;
      throw error;
    }
  },
};
