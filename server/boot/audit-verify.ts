import { connect } from '@/db/connect';
import { sha256Hex } from '../evaluation/sha256';
import { auditHeads } from '../store/audit';
import { followAudit, type KnownHead } from '../store/audit-chain';
import type { Database } from '../store/database';
import { knownHeads } from './audit-anchor';
import { ConfigError, readConfig } from './config';

/** `npm run -s audit-verify`: follows the audit chain of every lab from its first entry to its last. No server is needed, it may run meanwhile. */

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
  const { head, broken } = await followAudit(db, { labId: lab.labId, sha256: sha256Hex, known });
  return {
    ...{ labId: lab.labId, name: lab.name, entries: broken === null ? head.seq : broken.seq - 1 },
    ...{ head: broken === null && head.seq > 0 ? head.hash : null, valid: broken === null },
    ...{ brokenSeq: broken?.seq ?? null, why: broken?.why ?? null },
  };
}

interface Output {
  out: (text: string) => void;
  err: (text: string) => void;
}

const toProcess: Output = { out: (text) => process.stdout.write(text), err: (text) => process.stderr.write(text) };

/** The command: one JSON object on `out`; 0 where all chains are whole, else 2 and on `err` a sentence for each that is not. */
export async function main(environment: Record<string, string | undefined>, output: Output = toProcess): Promise<number> {
  try {
    const { databaseUrl, stateDir } = readConfig(environment);
    const connection = connect({ url: databaseUrl, maxConnections: 1, statementTimeoutMs: 60_000 });
    try {
      const known = await knownHeads(stateDir);
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
