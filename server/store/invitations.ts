import { and, asc, eq, gt, isNull } from 'drizzle-orm';
import { invitations, labs, users } from '@/db/schema';
import type { Role } from '@/shared/contracts/roles';
import { one, type Handle } from './database';
import { normalEmail } from './people';

export interface Invitation {
  labId: string;
  labName: string;
  timeZone: string;
  id: string;
  email: string;
  role: Role;
  invitedBy: string;
  /** UTC ms. */
  createdAt: number;
  expiresAt: number;
}

const columns = {
  labId: invitations.labId,
  labName: labs.name,
  timeZone: labs.timeZone,
  id: invitations.id,
  email: invitations.email,
  role: invitations.role,
  invitedBy: users.name,
  createdAt: invitations.createdAt,
  expiresAt: invitations.expiresAt,
};

const select = (db: Handle) =>
  db
    .select(columns)
    .from(invitations)
    .innerJoin(labs, eq(labs.id, invitations.labId))
    .innerJoin(users, eq(users.id, invitations.invitedById));
const open = (nowUtcMs: number) =>
  and(isNull(invitations.acceptedAt), isNull(invitations.withdrawnAt), gt(invitations.expiresAt, nowUtcMs));

/** Only the hash of the token is kept. */
export async function createInvitation(
  db: Handle,
  invitation: {
    labId: string;
    email: string;
    role: Role;
    tokenHash: string;
    invitedById: string;
    nowUtcMs: number;
    expiresAtUtcMs: number;
  },
): Promise<{ id: string }> {
  const { nowUtcMs, expiresAtUtcMs, email, ...fields } = invitation;
  const row = one(
    await db
      .insert(invitations)
      .values({ ...fields, email: normalEmail(email), createdAt: nowUtcMs, expiresAt: expiresAtUtcMs })
      .returning(),
  );
  return { id: row.id };
}

/** Invitations of a lab that can still be accepted, the oldest first. */
export function openInvitations(db: Handle, labId: string, nowUtcMs: number): Promise<Invitation[]> {
  return select(db)
    .where(and(eq(invitations.labId, labId), open(nowUtcMs)))
    .orderBy(asc(invitations.createdAt));
}

export async function openInvitationByToken(db: Handle, tokenHash: string, nowUtcMs: number): Promise<Invitation | null> {
  const rows = await select(db).where(and(eq(invitations.tokenHash, tokenHash), open(nowUtcMs)));
  return rows[0] ?? null;
}

export async function openInvitationById(db: Handle, which: { labId: string; id: string; nowUtcMs: number }): Promise<Invitation | null> {
  const rows = await select(db).where(and(eq(invitations.labId, which.labId), eq(invitations.id, which.id), open(which.nowUtcMs)));
  return rows[0] ?? null;
}

/** The token that works from now on; an earlier one does not any more. */
export async function setInvitationToken(db: Handle, invitation: { labId: string; id: string; tokenHash: string }): Promise<void> {
  await db
    .update(invitations)
    .set({ tokenHash: invitation.tokenHash })
    .where(and(eq(invitations.labId, invitation.labId), eq(invitations.id, invitation.id)));
}

/** Uses an invitation up; false when somebody else just did, or when it is not open any more. */
export async function takeInvitation(db: Handle, which: { labId: string; id: string; nowUtcMs: number }): Promise<boolean> {
  const rows = await db
    .update(invitations)
    .set({ acceptedAt: which.nowUtcMs })
    .where(and(eq(invitations.labId, which.labId), eq(invitations.id, which.id), open(which.nowUtcMs)))
    .returning();
  return rows.length === 1;
}

/** False when there is no such open invitation. */
export async function withdrawInvitation(db: Handle, which: { labId: string; id: string; nowUtcMs: number }): Promise<boolean> {
  const rows = await db
    .update(invitations)
    .set({ withdrawnAt: which.nowUtcMs })
    .where(and(eq(invitations.labId, which.labId), eq(invitations.id, which.id), open(which.nowUtcMs)))
    .returning();
  return rows.length === 1;
}
