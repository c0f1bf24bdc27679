import { emptyChain, verifyChain, type ChainHead, type Sha256 } from '@/shared/archive/chain';
import type { ChainedEvent } from '@/shared/archive/run-records';
import { auditLinks } from './audit';
import type { Handle } from './database';

/** Following a lab's audit chain from its first entry on. */

/** Where a chain ended on an earlier day, as it was written down outside of the database. */
export interface KnownHead {
  at: string;
  labId: string;
  seq: number;
  hash: string;
}

export interface FollowedChain {
  /** The last entry that is right with all before it. */
  head: ChainHead;
  /** The first entry that is not right; null where all that were followed are. */
  broken: { seq: number; why: string } | null;
  /** False where there are more entries than were asked for. */
  complete: boolean;
}

export interface Following {
  labId: string;
  sha256: Sha256;
  known?: readonly KnownHead[];
  pageSize?: number;
  /** Stops after so many entries. */
  atMost?: number;
  /** Sees each page of entries before it is followed. */
  onPage?: (links: readonly ChainedEvent[]) => Promise<void> | void;
}

export async function followAudit(
  db: Handle,
  { labId, sha256, known = [], pageSize = 5_000, atMost = Number.POSITIVE_INFINITY, onPage }: Following,
): Promise<FollowedChain> {
  let head: ChainHead = emptyChain;
  const awaited = known.filter((one) => one.labId === labId).sort((one, other) => one.seq - other.seq);
  const brokenAt = (seq: number, why: string): FollowedChain => ({ head, broken: { seq, why }, complete: true });
  for (;;) {
    const links = await auditLinks(db, { labId, afterSeq: head.seq, limit: Math.min(pageSize, atMost - head.seq) });
    await onPage?.(links);
    const before = head;
    const check = verifyChain(links, sha256, before);
    if (!check.valid) {
      const last = links.find(({ seq }) => seq === check.seq - 1);
      head = last ?? before;
      return brokenAt(check.seq, check.why);
    }
    for (const { at, seq, hash } of awaited)
      if (links.some((link) => link.seq === seq && link.hash !== hash))
        return brokenAt(seq, `entry ${String(seq)} had another hash on ${at}: what comes before it was written anew`);
    head = check.head;
    if (links.length === 0) break;
    if (head.seq >= atMost)
      return { head, broken: null, complete: (await auditLinks(db, { labId, afterSeq: head.seq, limit: 1 })).length === 0 };
  }
  const cut = awaited.find(({ seq }) => seq > head.seq);
  if (cut === undefined) return { head, broken: null, complete: true };
  const why = `the chain ended at entry ${String(cut.seq)} on ${cut.at} and now ends at ${String(head.seq)}: its end was cut off`;
  return brokenAt(head.seq + 1, why);
}
