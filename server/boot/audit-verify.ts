import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { connect } from '@/db/connect';
import { emptyChain, verifyChain, type ChainHead } from '@/shared/archive/chain';
import { sha256Hex } from '../evaluation/sha256';
import { auditHeads, auditLinks } from '../store/audit';
import type { Database } from '../store/database';
import { headsFileName, readHeads, type KnownHead } from './audit-anchor';
import { ConfigError, readConfig } from './config';

/** `npm run -s audit-verify`: follows the audit chain of every lab from its first entry to its last. No server is needed, it may run meanwhile. */

const pageSize = 5_000;

export interface LabAudit {
  labId: string;
  name: string;
  /** Entries that were followed; those before the break where there is one. */
  entries: number;
  /** Hash of the last entry; null where there is none, or where the chain is broken. */
  head: string | null;
  valid: boolean;
  /** The first entry that is not right; null where all are. */
  brokenSeq: number | null;
  why: string | null;
}

/** Follows one lab's chain and holds it against the heads that were written down on earlier days. */
export async function verifyLabAudit(
  db: Database,
  lab: { labId: string; name: string },
  known: readonly KnownHead[] = [],
): Promise<LabAudit> {
  let head: ChainHead = emptyChain;
  const result = (brokenSeq: number | null, why: string | null): LabAudit => ({
    ...{ labId: lab.labId, name: lab.name, entries: brokenSeq === null ? head.seq : brokenSeq - 1 },
    ...{ head: brokenSeq === null && head.seq > 0 ? head.hash : null, valid: brokenSeq === null, brokenSeq, why },
  });
  const awaited = known.filter(({ labId }) => labId === lab.labId).sort((one, other) => one.seq - other.seq);
  for (;;) {
    const links = await auditLinks(db, { labId: lab.labId, afterSeq: head.seq, limit: pageSize });
    const check = verifyChain(links, sha256Hex, head);
    if (!check.valid) return result(check.seq, check.why);
    for (const { at, seq, hash } of awaited)
      if (links.some((link) => link.seq === seq && link.hash !== hash))
        return result(seq, `entry ${String(seq)} had another hash on ${at}: what comes before it was written anew`);
    if (links.length === 0) break;
    head = check.head;
  }
  const cut = awaited.find(({ seq }) => seq > head.seq);
  if (cut === undefined) return result(null, null);
  return result(
    head.seq + 1,
    `the chain ended at entry ${String(cut.seq)} on ${cut.at} and now ends at ${String(head.seq)}: its end was cut off`,
  );
}

interface Output {
  out: (text: string) => void;
  err: (text: string) => void;
}

const toProcess: Output = { out: (text) => process.stdout.write(text), err: (text) => process.stderr.write(text) };

function headsOf(stateDir: string): KnownHead[] {
  try {
    return readHeads(readFileSync(join(stateDir, headsFileName), 'utf8'));
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code === 'ENOENT') return [];
    throw error;
  }
}

/** The command: one JSON object on `out`; 0 where all chains are whole, else 2 and on `err` a sentence for each that is not. */
export async function main(environment: Record<string, string | undefined>, output: Output = toProcess): Promise<number> {
  try {
    const { databaseUrl, stateDir } = readConfig(environment);
    const connection = connect({ url: databaseUrl, maxConnections: 1, statementTimeoutMs: 60_000 });
    try {
      const known = headsOf(stateDir);
      const labs: LabAudit[] = [];
      for (const lab of await auditHeads(connection.db)) labs.push(await verifyLabAudit(connection.db, lab, known));
      output.out(`${JSON.stringify({ valid: labs.every(({ valid }) => valid), labs }, null, 2)}\n`);
      for (const { name, labId, brokenSeq, why } of labs)
        if (brokenSeq !== null)
          output.err(`audit-verify: ${name} (${labId}): the chain is broken at seq ${String(brokenSeq)}: ${why ?? ''}\n`);
      return labs.every(({ valid }) => valid) ? 0 : 2;
    } finally {
      await connection.close();
    }
  } catch (error) {
    const words = error instanceof ConfigError ? error.message : `the audit could not be read: ${(error as Error).message}`;
    output.err(`audit-verify: ${words}\n`);
    return 2;
  }
}

if (require.main === module) void main(process.env).then((code) => (process.exitCode = code));
