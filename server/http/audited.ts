import { appendAudit } from '../store/audit';
import type { Transaction } from '../store/database';
import type { Membership, SignedIn } from './route-context';
import type { Services } from './services';

/** Does something in one transaction together with its entry in the lab's audit chain. */
export function audited<T>(
  context: { me: SignedIn; membership: Membership; services: Services },
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
