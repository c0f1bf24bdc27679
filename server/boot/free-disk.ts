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

export interface Disk {
  /** In words. */
  disk: string;
  /** Part of it that may still be filled, 0 to 1; null where it does not tell. */
  free(): Promise<number | null>;
}

/** Of the server's disks, by folders on them, and others the one that is nearest to being full; one that does not tell does not count. */
export async function fullest(folders: readonly string[], ...others: readonly Disk[]): Promise<{ disk: string; free: number } | null> {
  const disks = [...folders.map((folder): Disk => ({ disk: 'the disk of the server', free: () => freeDisk(folder) })), ...others];
  const parts = await Promise.all(disks.map(async (one) => ({ disk: one.disk, free: await one.free() })));
  return parts.reduce<{ disk: string; free: number } | null>(
    (least, { disk, free }) => (free !== null && (least === null || free < least.free) ? { disk, free } : least),
    null,
  );
}

/** Bytes that this process may still write on the disk of a folder; null likewise. */
export const freeBytesAt = (folder: string): Promise<number | null> =>
  statfs(folder).then(
    ({ bavail, bsize }) => bavail * bsize,
    () => null,
  );
