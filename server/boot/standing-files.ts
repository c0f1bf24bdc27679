import { mkdir, open, readdir, readFile, rename, rm } from 'node:fs/promises';
import { join } from 'node:path';
import * as z from 'zod';
import type { StandingEntry, StandingJournal } from '../interfaces/standing-journal';

/** Raised whenever the shape of a file changes. */
const VERSION = 1;

const place = { labId: z.string(), rigId: z.string() };
const lockSchema = z.strictObject({
  ...place,
  ...{ id: z.string(), userId: z.string(), name: z.string(), note: z.string(), setUtcMs: z.number() },
});
const endSchema = z.strictObject({
  ...place,
  ...{ armId: z.string(), why: z.string(), atUtcMs: z.number() },
  by: z.strictObject({ id: z.string().nullable(), name: z.string() }),
});
const fileSchema = z.strictObject({
  standing: z.literal(VERSION),
  entry: z.discriminatedUnion('kind', [
    z.strictObject({ kind: z.literal('lock-set'), lock: lockSchema }),
    z.strictObject({ kind: z.literal('arm-ended'), end: endSchema }),
  ]),
});

const plain = (text: string) => text.replaceAll(/[^\w-]/g, '');
const ending = '.json';

function nameOf(entry: StandingEntry): string {
  const [rigId, id] = entry.kind === 'lock-set' ? [entry.lock.rigId, entry.lock.id] : [entry.end.rigId, entry.end.armId];
  return `${plain(rigId)}.${entry.kind}.${plain(id)}${ending}`;
}

/** A small file of the state folder for each entry. It has its name only when all of it is on the disk: a crash leaves the whole entry or none. */
export class StandingFiles implements StandingJournal {
  constructor(private readonly folder: string) {}

  async keep(entry: StandingEntry): Promise<void> {
    await mkdir(this.folder, { recursive: true });
    const path = join(this.folder, nameOf(entry));
    const file = await open(`${path}.new`, 'w', 0o600);
    try {
      await file.writeFile(JSON.stringify({ standing: VERSION, entry }));
      await file.sync();
    } finally {
      await file.close();
    }
    await rename(`${path}.new`, path);
    await this.syncFolder();
  }

  async of(rigId: string): Promise<StandingEntry[]> {
    const names = await readdir(this.folder).catch((error: NodeJS.ErrnoException) => {
      if (error.code === 'ENOENT') return [];
      throw error;
    });
    const own = names.filter((name) => name.startsWith(`${plain(rigId)}.`) && name.endsWith(ending)).sort();
    return Promise.all(own.map((name) => this.read(join(this.folder, name))));
  }

  async forget(entry: StandingEntry): Promise<void> {
    await rm(join(this.folder, nameOf(entry)), { force: true });
  }

  private async read(path: string): Promise<StandingEntry> {
    const text = await readFile(path, 'utf8');
    try {
      return fileSchema.parse(JSON.parse(text)).entry;
    } catch {
      throw new Error(
        `${path} is not to be read by this version (${VERSION}). It keeps a personal lock or the end of an arm that the database does not have; start the version of the server that wrote it, or move the file away when nobody's hands are in the rig.`,
      );
    }
  }

  /** A new name in a folder outlives a power cut only when the folder itself was written. */
  private async syncFolder(): Promise<void> {
    const folder = await open(this.folder, 'r');
    await folder.sync().finally(() => folder.close());
  }
}
