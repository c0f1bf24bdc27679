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

/** Bytes that this process may still write on the disk of a folder; null likewise. */
export const freeBytesAt = (folder: string): Promise<number | null> =>
  statfs(folder).then(
    ({ bavail, bsize }) => bavail * bsize,
    () => null,
  );
