import { passwordSchema } from '@/shared/contracts/people';
import type { Role } from '@/shared/contracts/roles';
import { appendAudit } from '../store/audit';
import type { Transaction } from '../store/database';
import { createInvitation, openInvitationByToken, openInvitations, takeInvitation, type Invitation } from '../store/invitations';
import { askForInvitationMail } from '../store/mail-requests';
import { addMember, createUser, membersOf, normalEmail, userByEmail, type User } from '../store/people';
import type { AuthParts, Device, Wait } from './auth-parts';
import { checkCredentials } from './credentials';
import { hashPassword, weaknessOf } from './passwords';
import { countTry, rates } from './rates';

const validMs = 7 * 24 * 3_600_000;

export type Invite = { kind: 'invited'; invitation: Invitation } | { kind: 'is-member' } | { kind: 'is-invited' } | Wait;

/** Invites somebody; the mail follows by itself. */
export async function invite(
  parts: AuthParts,
  who: { labId: string; by: Pick<User, 'id' | 'name'> },
  given: { email: string; role: Role; origin: string },
): Promise<Invite> {
  const wait = await countTry(parts, [{ rule: rates.inviteLab, subject: who.labId }]);
  if (wait !== null) return wait;
  const email = normalEmail(given.email);
  return parts.db.transaction(async (tx) => {
    const nowUtcMs = parts.clock.utcMs();
    if ((await membersOf(tx, who.labId)).some((member) => member.email === email)) return { kind: 'is-member' };
    if ((await openInvitations(tx, who.labId, nowUtcMs)).some((open) => open.email === email)) return { kind: 'is-invited' };
    // No mail carries this first token: the sender makes the one that does.
    const tokenHash = parts.sha256(parts.newToken());
    const { id } = await createInvitation(tx, {
      labId: who.labId,
      email,
      role: given.role,
      tokenHash,
      invitedById: who.by.id,
      nowUtcMs,
      expiresAtUtcMs: nowUtcMs + validMs,
    });
    await askForInvitationMail(tx, { labId: who.labId, invitationId: id, origin: given.origin }, nowUtcMs);
    await appendAudit(
      tx,
      {
        labId: who.labId,
        who: { id: who.by.id, name: who.by.name },
        kind: 'member.invited',
        data: { invitationId: id, role: given.role },
        utcMs: nowUtcMs,
      },
      parts.sha256,
    );
    const invitation = (await openInvitations(tx, who.labId, nowUtcMs)).find((open) => open.id === id);
    if (invitation === undefined) throw new Error('the new invitation is not there');
    return { kind: 'invited', invitation };
  });
}

export type Offer = { kind: 'open'; invitation: Invitation; hasAccount: boolean } | { kind: 'unknown-token' } | Wait;

/** What an invitation token offers. */
export async function readInvitation(parts: AuthParts, given: { token: string; ip: string }): Promise<Offer> {
  const wait = await countTry(parts, [{ rule: rates.tokenAddress, subject: given.ip }]);
  if (wait !== null) return wait;
  const invitation = await openInvitationByToken(parts.db, parts.sha256(given.token), parts.clock.utcMs());
  if (invitation === null) return { kind: 'unknown-token' };
  return { kind: 'open', invitation, hasAccount: (await userByEmail(parts.db, invitation.email)) !== null };
}

export type Acceptance =
  | { kind: 'joined'; user: User; token: string; expiresAt: Date }
  | { kind: 'unknown-token' }
  | { kind: 'wrong' }
  | { kind: 'refused'; field: 'name' | 'password'; why: string }
  | Wait;

/** Joins the lab with a known account and its password, or with a new one; signs in. */
export async function acceptInvitation(
  parts: AuthParts,
  given: { token: string; name?: string | undefined; password: string },
  device: Device,
): Promise<Acceptance> {
  const offer = await readInvitation(parts, { token: given.token, ip: device.ip });
  if (offer.kind !== 'open') return offer;
  const { invitation } = offer;
  const account = offer.hasAccount
    ? await knownAccount(parts, { email: invitation.email, password: given.password, ip: device.ip })
    : await newAccount(given, invitation.email);
  if (account.kind !== 'known' && account.kind !== 'new') return account;
  const user = await join(parts, invitation, account);
  if (user === null) return { kind: 'unknown-token' };
  return { kind: 'joined', user, ...(await parts.sessions.create(user.id, device)) };
}

type Account = { kind: 'known'; user: User } | { kind: 'new'; name: string; passwordHash: string };

async function knownAccount(
  parts: AuthParts,
  given: { email: string; password: string; ip: string },
): Promise<Account | { kind: 'wrong' } | Wait> {
  const check = await checkCredentials(parts, given);
  return check.kind === 'right' ? { kind: 'known', user: check.user } : check;
}

async function newAccount(
  given: { name?: string | undefined; password: string },
  email: string,
): Promise<Account | { kind: 'refused'; field: 'name' | 'password'; why: string }> {
  const name = given.name?.trim() ?? '';
  if (name === '') return { kind: 'refused', field: 'name', why: 'a new account needs a name' };
  const form = passwordSchema.safeParse(given.password);
  if (!form.success) return { kind: 'refused', field: 'password', why: form.error.issues[0]?.message ?? 'this is no password' };
  const weakness = weaknessOf(given.password, [name, email]);
  return weakness === null
    ? { kind: 'new', name, passwordHash: await hashPassword(given.password) }
    : { kind: 'refused', field: 'password', why: weakness };
}

/** Rolls the joining back. */
class Overtaken extends Error {}

/** Null when the invitation was used, withdrawn or overtaken (the address got an account) meanwhile. */
async function join(parts: AuthParts, invitation: Invitation, account: Account): Promise<User | null> {
  const nowUtcMs = parts.clock.utcMs();
  const { labId, email, role } = invitation;
  const work = async (tx: Transaction) => {
    if (!(await takeInvitation(tx, { labId, id: invitation.id, nowUtcMs }))) throw new Overtaken();
    const user =
      account.kind === 'known'
        ? account.user
        : await createUser(tx, { name: account.name, email, passwordHash: account.passwordHash, nowUtcMs });
    if (user === null) throw new Overtaken();
    const joined = await addMember(tx, { labId, userId: user.id, role, nowUtcMs });
    const kind = joined ? 'member.joined' : 'member.already-in';
    await appendAudit(
      tx,
      { labId, who: { id: user.id, name: user.name }, kind, data: { invitationId: invitation.id, role }, utcMs: nowUtcMs },
      parts.sha256,
    );
    return user;
  };
  return parts.db.transaction(work).catch((error: unknown) => {
    if (error instanceof Overtaken) return null;
    throw error;
  });
}
