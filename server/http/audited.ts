import { appendAudit } from '../store/audit';
import type { Handle, Transaction } from '../store/database';
import type { Membership, SignedIn } from './route-context';
import type { Services } from './services';
import { untilStored } from './until-stored';

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
  const { services } = context;
  return services.database.db.transaction(async (tx) => {
    const done = await act(tx);
    await enterAudit(tx, context, { kind: entry.kind, data: entry.data(done) });
    return done;
  });
}

/** The entry alone, in a transaction that the caller has. */
export function enterAudit(
  tx: Handle,
  { me, membership, services }: InTheNameOf,
  entry: { kind: string; data: Record<string, unknown> },
): Promise<void> {
  const fact = { labId: membership.labId, who: { id: me.userId, name: me.name }, ...entry, utcMs: services.clock.utcMs() };
  return appendAudit(tx, fact, services.sha256);
}

/** Enters what a person did into the audit chain when the database can be reached; the act itself does not wait for it. */
export function auditLater({ me, membership, services }: InTheNameOf, kind: string, data: Record<string, unknown>): void {
  const fact = { labId: membership.labId, who: { id: me.userId, name: me.name }, kind, data, utcMs: services.clock.utcMs() };
  const { database, sha256 } = services;
  untilStored(services, () => database.db.transaction((tx) => appendAudit(tx, fact, sha256)), 'an entry of the audit chain');
}
