import * as contracts from '@/shared/contracts/audit';
import type { AuditCheck, AuditEntry } from '@/shared/contracts/audit';
import { dayStartUtcMs } from '@/shared/protocol/local-time';
import { auditPage, type AuditRow } from '@/server/store/audit';
import { followAudit } from '@/server/store/audit-chain';
import { isoOf } from '../maker';
import { decodeCursor, pageFrom } from '../paging';
import { mount } from '../route-context';
import type { Services } from '../services';

/** A page of entries is followed in a few milliseconds; between them whoever holds or stops has a turn. */
const pageSize = 1_000;
/** Followed within a second or two; a lab gets there in years. */
const atMost = 200_000;

interface Who {
  id: string | null;
  name: string;
}

function whoOf(data: Record<string, unknown>): Who {
  const { id, name } = (data.who ?? {}) as { id?: unknown; name?: unknown };
  return { id: typeof id === 'string' ? id : null, name: typeof name === 'string' ? name : 'unknown' };
}

const entryOf = ({ seq, at, kind, data, hash }: AuditRow): AuditEntry => ({ seq, at, who: whoOf(data).name, kind, data, hash });

async function checkOf({ database, sha256, knownAuditHeads, breathe, clock }: Services, labId: string): Promise<AuditCheck> {
  const people = new Map<string, string>();
  const kinds = new Set<string>();
  const { head, broken, complete } = await followAudit(database.db, {
    ...{ labId, sha256, pageSize, atMost },
    known: await knownAuditHeads(),
    onPage: (links) => {
      for (const { kind, data } of links) {
        const { id, name } = whoOf(data);
        // Under the name that was used last.
        people.set(id ?? contracts.server, name);
        kinds.add(kind);
      }
      return breathe();
    },
  });
  return {
    ...{ valid: broken === null, upToSeq: head.seq, hash: head.seq === 0 ? '' : head.hash, broken, complete },
    checkedAt: isoOf(clock.utcMs()),
    people: [...people].map(([id, name]) => ({ id, name })).sort((a, b) => a.name.localeCompare(b.name)),
    kinds: [...kinds].sort(),
  };
}

export const auditRoutes = [
  mount(contracts.listAudit, async ({ membership, query, services }) => {
    const { labId, timeZone } = membership;
    const [beforeSeq] = decodeCursor(query.cursor, ['number']) ?? [null];
    const rows = await auditPage(services.database.db, {
      ...{ labId, beforeSeq, limit: query.limit + 1, kind: query.kind },
      whoId: query.who === contracts.server ? null : query.who,
      fromUtcMs: query.from === undefined ? undefined : dayStartUtcMs(query.from, timeZone),
      untilUtcMs: query.until === undefined ? undefined : dayStartUtcMs(query.until, timeZone, 1),
    });
    const page = pageFrom(rows, query.limit, (row) => [row.seq]);
    return { items: page.items.map(entryOf), next: page.next };
  }),

  mount(contracts.checkAudit, ({ membership, services }) => checkOf(services, membership.labId)),
];
