import { createReadStream } from 'node:fs';
import { mkdir, open, rename, rm } from 'node:fs/promises';
import { dirname, join } from 'node:path';
import { MissingObjectError, type ObjectFacts, type ObjectStore } from '../interfaces/object-store';
import { freeBytesAt } from './free-disk';

/** Files of a folder, each under its own name; one that is being written has a name that nobody reads. */
export class FolderObjects implements ObjectStore {
  constructor(private readonly folder: string) {}

  async put(name: string, source: AsyncIterable<Uint8Array>, { bytes }: ObjectFacts): Promise<void> {
    const path = this.pathOf(name);
    await mkdir(dirname(path), { recursive: true, mode: 0o700 });
    const part = `${path}.part`;
    const file = await open(part, 'w', 0o600);
    let written = 0;
    try {
      for await (const chunk of source) {
        await file.writeFile(chunk);
        written += chunk.length;
      }
      if (written !== bytes) throw new Error(`${String(written)} of ${String(bytes)} bytes came for ${name}`);
      await file.sync();
    } catch (error) {
      await file.close();
      await rm(part, { force: true });
      throw error;
    }
    await file.close();
    await rename(part, path);
    await settle(dirname(path));
  }

  async *read(name: string): AsyncGenerator<Uint8Array> {
    try {
      yield* createReadStream(this.pathOf(name), { highWaterMark: 1_048_576 }) as AsyncIterable<Buffer>;
    } catch (error) {
      if ((error as NodeJS.ErrnoException).code === 'ENOENT') throw new MissingObjectError(name);
      throw error;
    }
  }

  async remove(name: string): Promise<void> {
    await rm(`${this.pathOf(name)}.part`, { force: true });
    await rm(this.pathOf(name), { force: true });
  }

  async freeBytes(): Promise<number | null> {
    await mkdir(this.folder, { recursive: true, mode: 0o700 }).catch(() => undefined);
    return freeBytesAt(this.folder);
  }

  close(): void {
    return undefined;
  }

  private pathOf(name: string): string {
    const parts = name.split('/');
    if (!parts.every((part) => /^[\w-][\w.-]*$/.test(part))) throw new Error(`${name} is no name of an object`);
    return join(this.folder, ...parts);
  }
}

/** A new name lasts only once its folder is on the disk too. */
async function settle(folder: string): Promise<void> {
  const handle = await open(folder, 'r');
  await handle.sync().finally(() => handle.close());
}
