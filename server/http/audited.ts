import { appendAudit, type AuditFact } from '../store/audit';
import type { Transaction } from '../store/database';
import type { Membership, SignedIn } from './route-context';
import type { Services } from './services';

interface InTheNameOf {
  me: Pick<SignedIn, 'userId' | 'name'>;
  membership: Membership;
  services: Services;
}

/** Does something in one transaction together with its entry in the lab's audit chain. */
export function audited<T>(
  context: InTheNameOf,
  entry: { kind: string; data: (done: T) => Record<string, unknown> },
  act: (tx: Transaction) => Promise<T>,
): Promise<T> {
  const { me, membership, services } = context;
  return services.database.db.transaction(async (tx) => {
    const done = await act(tx);
    const fact = {
      labId: membership.labId,
      who: { id: me.userId, name: me.name },
      kind: entry.kind,
      data: entry.data(done),
      utcMs: services.clock.utcMs(),
    };
    await appendAudit(tx, fact, services.sha256);
    return done;
  });
}

/** Enters what a person did into the audit chain when the database can be reached; the act itself does not wait for it. */
export function auditLater({ me, membership, services }: InTheNameOf, kind: string, data: Record<string, unknown>): void {
  const fact = { labId: membership.labId, who: { id: me.userId, name: me.name }, kind, data, utcMs: services.clock.utcMs() };
  services.background(entered(services, fact), 'an entry of the audit chain');
}

const retryMs = 5_000;
/** An hour: the log of the run tells of it as well. */
const mostTries = 720;

async function entered({ database, clock, sha256 }: Services, fact: AuditFact): Promise<void> {
  for (let tries = 1; ; tries += 1) {
    try {
      await database.db.transaction((tx) => appendAudit(tx, fact, sha256));
      return;
    } catch (error) {
      if (tries === mostTries) throw error;
      await new Promise<void>((resolve) => void clock.after(retryMs, resolve));
    }
  }
}
