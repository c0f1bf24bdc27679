import { isIP } from 'node:net';
import type { Logger } from 'pino';
import type { ServerConfig } from '../interfaces/server-config';
import type { Connection } from '../store/database';
import { dataDirectory } from '../store/health';
import { freeDisk, type Disk } from './free-disk';

/** Whether an address of a database leads to this very machine. */
const isHere = (databaseUrl: string): boolean => {
  const host = new URL(databaseUrl).hostname.replace(/^\[|\]$/g, '');
  return host === '' || host === 'localhost' || host === '::1' || (isIP(host) === 4 && host.startsWith('127.'));
};

/**
 * The disk on which PostgreSQL keeps its data. Its folder is what the configuration says; else what PostgreSQL tells, where that runs on this machine and
 * lets its role know. Elsewhere nothing is known of it, which the log says once.
 */
export class DatabaseDisk implements Disk {
  readonly disk = 'the disk of the database';
  private folder: string | null;
  private told = false;

  constructor(
    private readonly config: Pick<ServerConfig, 'databaseUrl' | 'databaseDir'>,
    private readonly parts: { database: Connection; log: Logger },
  ) {
    this.folder = config.databaseDir;
  }

  /** Part of it that may still be filled, 0 to 1; null where that is not known. */
  async free(): Promise<number | null> {
    const free = await this.look();
    if (free === null && !this.told)
      this.parts.log.warn(
        'the disk of the database is not watched: EVENFALL_DATABASE_DIR names no folder on it that can be seen from here, and PostgreSQL tells none',
      );
    this.told ||= free === null;
    return free;
  }

  /** Once known, the folder needs no database: a full disk may be why it does not answer. */
  private async look(): Promise<number | null> {
    if (this.folder !== null) return freeDisk(this.folder);
    const folder = isHere(this.config.databaseUrl) ? await dataDirectory(this.parts.database).catch(() => null) : null;
    const free = folder === null ? null : await freeDisk(folder);
    if (free !== null) this.folder = folder;
    return free;
  }
}
