import { statfs } from 'node:fs/promises';

/** Part of the disk of a folder that may still be filled, 0 to 1; null where the system does not tell. */
export async function freeDisk(folder: string): Promise<number | null> {
  try {
    const { bavail, blocks } = await statfs(folder);
    return blocks > 0 ? bavail / blocks : null;
  } catch {
    return null;
  }
}

/** The least of several folders; one that is not there yet, or does not tell, does not count. */
export async function freeDisks(folders: readonly string[]): Promise<number | null> {
  const free = (await Promise.all(folders.map(freeDisk))).filter((part) => part !== null);
  return free.length === 0 ? null : Math.min(...free);
}

/** Bytes that this process may still write on the disk of a folder; null likewise. */
export const freeBytesAt = (folder: string): Promise<number | null> =>
  statfs(folder).then(
    ({ bavail, bsize }) => bavail * bsize,
    () => null,
  );
