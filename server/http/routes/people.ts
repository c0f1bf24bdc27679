import type { Request, Response } from 'express';
import * as contracts from '@/shared/contracts/people';
import type { InvitationView, Me, MemberView } from '@/shared/contracts/people';
import type { AuthParts, Wait } from '@/server/auth/auth-parts';
import * as invitations from '@/server/auth/invitations';
import * as resets from '@/server/auth/password-reset';
import { signIn, signOut } from '@/server/auth/sign-in';
import { appendAudit } from '@/server/store/audit';
import { openInvitations, withdrawInvitation, type Invitation } from '@/server/store/invitations';
import { changeLab } from '@/server/store/labs';
import { changeMember, memberOf, membersOf, membershipsOf, type Member } from '@/server/store/people';
import type { Role } from '@/shared/contracts/roles';
import { isTimeZone } from '@/shared/lib/is-time-zone';
import { isDatabaseAway } from '../../store/failures';
import { isoOf } from '../maker';
import { originForLinks } from '../origin';
import { notFound, ProblemError } from '../problem-error';
import { mount, type Membership, type SignedIn } from '../route-context';
import type { Services } from '../services';

const authOf = ({ database, clock, sessions, newToken, sha256, config }: Services): AuthParts => ({
  db: database.db,
  clock,
  sessions,
  newToken,
  sha256,
  demo: config.demo,
});
const deviceOf = (req: Request) => ({ userAgent: req.get('user-agent') ?? '', ip: req.ip ?? '' });
const ipOf = (req: Request) => req.ip ?? '';

const wrongCredentials = () =>
  new ProblemError('wrong-credentials', 'This e-mail and password do not belong together. Check both, or ask for a new password.');

function tooMany(res: Response, { seconds }: Wait, what: string): ProblemError {
  res.set('Retry-After', String(seconds));
  const when = seconds <= 90 ? `${String(seconds)} s` : `${String(Math.ceil(seconds / 60))} min`;
  return new ProblemError('too-many-requests', `${what} Try again in ${when}.`);
}

const tooManyTries = 'There were too many tries that failed.';
const invalidField = (path: string, message: string) =>
  new ProblemError('invalid-input', `${path} in the body: ${message}.`, [{ path, message }]);

async function meOf(services: Services, user: { id: string; name: string; email: string }, sessionExpiresAt: Date): Promise<Me> {
  return {
    user: { id: user.id, name: user.name, email: user.email },
    memberships: await membershipsOf(services.database.db, user.id),
    sessionExpiresAt: sessionExpiresAt.toISOString(),
  };
}

async function meOfToken(services: Services, user: { id: string; name: string; email: string }, token: string): Promise<Me> {
  const session = await services.sessions.validate(token);
  if (session === null) throw new Error('the new session does not stand');
  return meOf(services, user, session.expiresAt);
}

const invitationViewOf = ({ id, email, role, invitedBy, createdAt, expiresAt }: Invitation): InvitationView => ({
  id,
  email,
  role,
  invitedBy,
  createdAt: isoOf(createdAt),
  expiresAt: isoOf(expiresAt),
});
const memberViewOf = ({ since, ...member }: Member): MemberView => ({ ...member, since: isoOf(since) });

const sessionRoutes = [
  mount(contracts.signIn, async ({ body, req, res, services, setSession }) => {
    const outcome = await signIn(authOf(services), body, deviceOf(req));
    if (outcome.kind === 'wait') throw tooMany(res, outcome, tooManyTries);
    if (outcome.kind === 'wrong') throw wrongCredentials();
    setSession(outcome.token, outcome.expiresAt);
    return meOfToken(services, outcome.user, outcome.token);
  }),

  mount(contracts.getMe, async ({ me, services }) => {
    const user = { id: me.userId, name: me.name, email: me.email };
    try {
      return await meOf(services, user, me.session.expiresAt);
    } catch (error) {
      if (!isDatabaseAway(error)) throw error;
      return { user, memberships: services.access.rememberedMemberships(me.userId), sessionExpiresAt: me.session.expiresAt.toISOString() };
    }
  }),

  mount(contracts.signOut, async ({ me, services, clearSession }) => {
    await signOut(authOf(services), { token: me.token, user: { id: me.userId, name: me.name } });
    services.access.forgetSession(me.token);
    clearSession();
    return undefined;
  }),

  mount(contracts.requestPasswordReset, async ({ body, req, res, services }) => {
    const outcome = await resets.requestPasswordReset(authOf(services), {
      email: body.email,
      ip: ipOf(req),
      origin: originForLinks(req, services.config),
    });
    if (outcome.kind === 'wait') throw tooMany(res, outcome, 'Too many new passwords were asked for.');
    services.pokeJobs();
    return { sent: true as const };
  }),

  mount(contracts.completePasswordReset, async ({ body, req, res, services }) => {
    const outcome = await resets.completePasswordReset(authOf(services), { ...body, ip: ipOf(req) });
    if (outcome.kind === 'wait') throw tooMany(res, outcome, tooManyTries);
    if (outcome.kind === 'unknown-token')
      throw new ProblemError('not-found', 'This link was used before or is too old. Ask for a new one.');
    if (outcome.kind === 'weak') throw invalidField('password', outcome.why);
    services.access.forgetUser(outcome.userId);
    services.pokeJobs();
    return undefined;
  }),
];

const unknownInvitation = () =>
  new ProblemError('not-found', 'This invitation was used, withdrawn or is too old. Ask the lab for a new one.');

const invitationRoutes = [
  mount(contracts.getInvitation, async ({ params, req, res, services }) => {
    const offer = await invitations.readInvitation(authOf(services), { token: params.token, ip: ipOf(req) });
    if (offer.kind === 'wait') throw tooMany(res, offer, tooManyTries);
    if (offer.kind === 'unknown-token') throw unknownInvitation();
    const { labName, email, role } = offer.invitation;
    return { labName, email, role, hasAccount: offer.hasAccount };
  }),

  mount(contracts.acceptInvitation, async ({ params, body, req, res, services, setSession }) => {
    const outcome = await invitations.acceptInvitation(authOf(services), { token: params.token, ...body }, deviceOf(req));
    if (outcome.kind === 'wait') throw tooMany(res, outcome, tooManyTries);
    if (outcome.kind === 'unknown-token') throw unknownInvitation();
    if (outcome.kind === 'wrong')
      throw new ProblemError(
        'wrong-credentials',
        'This is not the password of your account. Give the one you sign in with, or ask for a new one.',
      );
    if (outcome.kind === 'refused') throw invalidField(outcome.field, outcome.why);
    setSession(outcome.token, outcome.expiresAt);
    return meOfToken(services, outcome.user, outcome.token);
  }),

  mount(contracts.invite, async ({ body, me, membership, req, res, services }) => {
    const by = { id: me.userId, name: me.name };
    const outcome = await invitations.invite(
      authOf(services),
      { labId: membership.labId, by },
      { ...body, origin: originForLinks(req, services.config) },
    );
    if (outcome.kind === 'wait') throw tooMany(res, outcome, 'This lab sent very many invitations.');
    if (outcome.kind === 'is-member')
      throw new ProblemError(
        'already-exists',
        `${body.email} is a member of ${membership.labName} already. Change the role in the list of members.`,
      );
    if (outcome.kind === 'is-invited')
      throw new ProblemError('already-exists', `${body.email} has an open invitation. Withdraw it first to send another.`);
    services.pokeJobs();
    return invitationViewOf(outcome.invitation);
  }),

  mount(contracts.withdrawInvitation, async ({ params, me, membership, services }) => {
    const nowUtcMs = services.clock.utcMs();
    const done = await services.database.db.transaction(async (tx) => {
      if (!(await withdrawInvitation(tx, { labId: membership.labId, id: params.invitationId, nowUtcMs }))) return false;
      await appendAudit(
        tx,
        factOf({ me, membership, services }, 'member.invitation-withdrawn', { invitationId: params.invitationId }),
        services.sha256,
      );
      return true;
    });
    if (!done) throw notFound('open invitation');
    return undefined;
  }),
];

const factOf = (
  { me, membership, services }: { me: SignedIn; membership: Membership; services: Services },
  kind: string,
  data: Record<string, unknown>,
) => ({
  labId: membership.labId,
  who: { id: me.userId, name: me.name },
  kind,
  data,
  utcMs: services.clock.utcMs(),
});

/** Changes or removes (`role` null) a member and audits it; the change holds from the next request on. */
async function alterMember(
  context: { me: SignedIn; membership: Membership; services: Services },
  userId: string,
  role: Role | null,
): Promise<Member | null> {
  const { services, membership } = context;
  const { labId } = membership;
  const outcome = await services.database.db.transaction(async (tx) => {
    const before = await memberOf(tx, labId, userId);
    const change = await changeMember(tx, { labId, userId, role });
    if (change === 'done')
      await appendAudit(
        tx,
        factOf(context, role === null ? 'member.removed' : 'member.role-changed', { userId, from: before?.role ?? null, to: role }),
        services.sha256,
      );
    return { change, after: await memberOf(tx, labId, userId) };
  });
  if (outcome.change === 'unknown') throw notFound('member');
  if (outcome.change === 'last-owner')
    throw new ProblemError('not-possible-now', `${membership.labName} has no other owner. Make somebody else owner first.`);
  services.access.forgetUser(userId);
  return outcome.after;
}

const memberRoutes = [
  mount(contracts.listMembers, async ({ membership, services }) => {
    const { db } = services.database;
    const [members, open] = [await membersOf(db, membership.labId), await openInvitations(db, membership.labId, services.clock.utcMs())];
    return { members: members.map(memberViewOf), invitations: open.map(invitationViewOf) };
  }),

  mount(contracts.changeMemberRole, async (context) => {
    const member = await alterMember(context, context.params.userId, context.body.role);
    if (member === null) throw notFound('member');
    return memberViewOf(member);
  }),

  mount(contracts.removeMember, async (context) => {
    await alterMember(context, context.params.userId, null);
    return undefined;
  }),
];

const labRoutes = [
  mount(contracts.getLab, ({ membership }) => ({ id: membership.labId, name: membership.labName, timeZone: membership.timeZone })),

  mount(contracts.changeLab, async (context) => {
    const { body, membership, services } = context;
    if (body.timeZone !== undefined && !isTimeZone(body.timeZone))
      throw invalidField('timeZone', `"${body.timeZone}" is no time zone; name one of the IANA list, for example Europe/Zurich`);
    const changed = await services.database.db.transaction(async (tx) => {
      const lab = await changeLab(tx, membership.labId, body);
      if (lab !== null)
        await appendAudit(
          tx,
          factOf(context, 'lab.changed', {
            from: { name: membership.labName, timeZone: membership.timeZone },
            to: { name: lab.name, timeZone: lab.timeZone },
          }),
          services.sha256,
        );
      return lab;
    });
    if (changed === null) throw notFound('lab');
    return { id: changed.id, name: changed.name, timeZone: changed.timeZone };
  }),
];

/** Sessions, passwords, invitations, members and the lab. */
export const peopleRoutes = [...sessionRoutes, ...invitationRoutes, ...memberRoutes, ...labRoutes];
