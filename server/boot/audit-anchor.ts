import { appendFile, readFile } from 'node:fs/promises';
import { join } from 'node:path';
import * as z from 'zod';
import type { Database } from '../store/database';
import { auditHeads } from '../store/audit';
import type { KnownHead } from '../store/audit-chain';

/**
 * Where each audit chain ended is written down day by day in a file beside the database: whoever may rewrite the database, and its chain
 * with it, is found out by whoever has the file.
 */

export const headsFileName = 'audit-heads.jsonl';

const headSchema = z.object({ at: z.string(), labId: z.string(), seq: z.number().int().positive(), hash: z.string() });

/** Adds the present head of every lab, a line each. */
export async function anchorAudit(db: Database, { stateDir, nowUtcMs }: { stateDir: string; nowUtcMs: number }): Promise<void> {
  const at = new Date(nowUtcMs).toISOString();
  const heads = (await auditHeads(db)).filter(({ head }) => head.seq > 0);
  const lines = heads.map(({ labId, head: { seq, hash } }) => `${JSON.stringify({ at, labId, seq, hash } satisfies KnownHead)}\n`);
  if (lines.length > 0) await appendFile(join(stateDir, headsFileName), lines.join(''), { mode: 0o600 });
}

/** The heads of a file's text. A line that was cut short by a crash is left out. */
export function readHeads(text: string): KnownHead[] {
  return text.split('\n').flatMap((line) => {
    try {
      return [headSchema.parse(JSON.parse(line))];
    } catch {
      return [];
    }
  });
}

/** What was written down so far; nothing where there is no file yet. */
export async function knownHeads(stateDir: string): Promise<KnownHead[]> {
  try {
    return readHeads(await readFile(join(stateDir, headsFileName), 'utf8'));
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code === 'ENOENT') return [];
    throw error;
  }
}
