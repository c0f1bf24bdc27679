import { appendAudit } from '../store/audit';
import type { Transaction } from '../store/database';
import { membershipsOf, type User } from '../store/people';
import type { AuthParts, Device, Wait } from './auth-parts';
import { checkCredentials } from './credentials';

export type SignIn = { kind: 'signed-in'; user: User; token: string; expiresAt: Date } | { kind: 'wrong' } | Wait;

/** Signs in with e-mail and password; the session's token is always a new one. */
export async function signIn(parts: AuthParts, given: { email: string; password: string }, device: Device): Promise<SignIn> {
  const check = await checkCredentials(parts, { ...given, ip: device.ip });
  if (check.kind !== 'right') return check;
  await parts.db.transaction((tx) => auditInAllLabs(tx, { user: check.user, kind: 'person.signed-in' }, parts));
  return { kind: 'signed-in', user: check.user, ...(await parts.sessions.create(check.user.id, device)) };
}

/** Ends one session. */
export async function signOut(parts: AuthParts, who: { token: string; user: Pick<User, 'id' | 'name'> }): Promise<void> {
  await parts.db.transaction((tx) => auditInAllLabs(tx, { user: who.user, kind: 'person.signed-out' }, parts));
  await parts.sessions.end(who.token);
}

/** An act of a person that concerns every lab the person is in. */
export async function auditInAllLabs(
  tx: Transaction,
  act: { user: Pick<User, 'id' | 'name'>; kind: string; data?: Record<string, unknown> },
  { clock, sha256 }: Pick<AuthParts, 'clock' | 'sha256'>,
): Promise<void> {
  // Always in the same order, so that two people who share labs cannot wait for each other's chains.
  const labIds = (await membershipsOf(tx, act.user.id)).map((membership) => membership.labId).sort();
  for (const labId of labIds)
    await appendAudit(
      tx,
      { labId, who: { id: act.user.id, name: act.user.name }, kind: act.kind, data: act.data ?? {}, utcMs: clock.utcMs() },
      sha256,
    );
}
