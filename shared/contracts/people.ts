import * as z from 'zod';
import { idSchema, instantSchema } from './common';
import { roles } from './roles';
import { defineRoute } from './route';

const roleSchema = z.enum(roles);
export const passwordSchema = z.string().min(12, 'a password has at least 12 characters').max(256);
const emailSchema = z.email().max(254);

export const membershipViewSchema = z.strictObject({ labId: idSchema, labName: z.string(), timeZone: z.string(), role: roleSchema });
export const meSchema = z.strictObject({
  user: z.strictObject({ id: idSchema, name: z.string(), email: z.string() }),
  memberships: z.array(membershipViewSchema),
  sessionExpiresAt: instantSchema,
});
export type Me = z.infer<typeof meSchema>;
export type MembershipView = z.infer<typeof membershipViewSchema>;

export const signIn = defineRoute({
  name: 'signIn',
  summary: 'Sign in with e-mail and password',
  method: 'POST',
  path: '/session',
  access: 'public',
  status: 200,
  body: z.strictObject({ email: emailSchema, password: z.string().min(1).max(256) }),
  response: meSchema,
  problems: ['invalid-input', 'wrong-credentials', 'too-many-requests'],
});
export const getMe = defineRoute({
  name: 'getMe',
  summary: 'Who is signed in, and in which labs',
  method: 'GET',
  path: '/session',
  access: 'signed-in',
  fromMemory: true,
  status: 200,
  response: meSchema,
  problems: [],
});
export const signOut = defineRoute({
  name: 'signOut',
  summary: 'End this session',
  method: 'DELETE',
  path: '/session',
  access: 'signed-in',
  status: 204,
  problems: [],
});

export const requestPasswordReset = defineRoute({
  name: 'requestPasswordReset',
  summary: 'Send a password reset link; the answer never tells whether the address is known',
  method: 'POST',
  path: '/password-resets',
  access: 'public',
  status: 202,
  body: z.strictObject({ email: emailSchema }),
  response: z.strictObject({ sent: z.literal(true) }),
  problems: ['invalid-input', 'too-many-requests'],
});
export const completePasswordReset = defineRoute({
  name: 'completePasswordReset',
  summary: 'Set a new password with a token from the mail; ends all sessions of the account',
  method: 'POST',
  path: '/password-resets/complete',
  access: 'public',
  status: 204,
  body: z.strictObject({ token: z.string().min(1), password: passwordSchema }),
  problems: ['invalid-input', 'not-found', 'too-many-requests'],
});

export const invitationViewSchema = z.strictObject({
  id: idSchema,
  email: z.string(),
  role: roleSchema,
  invitedBy: z.string(),
  createdAt: instantSchema,
  expiresAt: instantSchema,
});
export const memberViewSchema = z.strictObject({
  userId: idSchema,
  name: z.string(),
  email: z.string(),
  role: roleSchema,
  since: instantSchema,
});
export type MemberView = z.infer<typeof memberViewSchema>;
export type InvitationView = z.infer<typeof invitationViewSchema>;

export const getInvitation = defineRoute({
  name: 'getInvitation',
  summary: 'What an invitation token offers',
  method: 'GET',
  path: '/invitations/:token',
  access: 'public',
  status: 200,
  response: z.strictObject({ labName: z.string(), email: z.string(), role: roleSchema, hasAccount: z.boolean() }),
  problems: ['not-found', 'too-many-requests'],
});
export const acceptInvitation = defineRoute({
  name: 'acceptInvitation',
  summary: 'Join the lab; a new account needs a name and a password, a known one signs in with its own',
  method: 'POST',
  path: '/invitations/:token/accept',
  access: 'public',
  status: 200,
  body: z.strictObject({ name: z.string().min(1).max(120).optional(), password: z.string().min(1).max(256) }),
  response: meSchema,
  problems: ['invalid-input', 'not-found', 'wrong-credentials', 'too-many-requests'],
});
export const listMembers = defineRoute({
  name: 'listMembers',
  summary: 'Members of the lab and open invitations',
  method: 'GET',
  path: '/labs/:labId/members',
  access: 'read',
  status: 200,
  response: z.strictObject({ members: z.array(memberViewSchema), invitations: z.array(invitationViewSchema) }),
  problems: ['not-found'],
});
export const invite = defineRoute({
  name: 'invite',
  summary: 'Invite somebody by e-mail',
  method: 'POST',
  path: '/labs/:labId/invitations',
  access: 'members.manage',
  status: 201,
  idempotent: true,
  body: z.strictObject({ email: emailSchema, role: roleSchema }),
  response: invitationViewSchema,
  problems: ['invalid-input', 'already-exists', 'too-many-requests'],
});
export const withdrawInvitation = defineRoute({
  name: 'withdrawInvitation',
  summary: 'Withdraw an open invitation',
  method: 'DELETE',
  path: '/labs/:labId/invitations/:invitationId',
  access: 'members.manage',
  status: 204,
  problems: ['not-found'],
});
export const changeMemberRole = defineRoute({
  name: 'changeMemberRole',
  summary: 'Change the role of a member; the last owner keeps the role',
  method: 'PATCH',
  path: '/labs/:labId/members/:userId',
  access: 'members.manage',
  status: 200,
  body: z.strictObject({ role: roleSchema }),
  response: memberViewSchema,
  problems: ['invalid-input', 'not-found', 'not-possible-now'],
});
export const removeMember = defineRoute({
  name: 'removeMember',
  summary: 'Remove a member; the last owner stays',
  method: 'DELETE',
  path: '/labs/:labId/members/:userId',
  access: 'members.manage',
  status: 204,
  problems: ['not-found', 'not-possible-now'],
});

export const labViewSchema = z.strictObject({ id: idSchema, name: z.string(), timeZone: z.string() });
export const getLab = defineRoute({
  name: 'getLab',
  summary: 'The lab',
  method: 'GET',
  path: '/labs/:labId',
  access: 'read',
  status: 200,
  response: labViewSchema,
  problems: ['not-found'],
});
export const changeLab = defineRoute({
  name: 'changeLab',
  summary: 'Name and time zone of the lab',
  method: 'PATCH',
  path: '/labs/:labId',
  access: 'lab.settings',
  status: 200,
  body: z.strictObject({ name: z.string().min(1).max(120).optional(), timeZone: z.string().min(1).max(64).optional() }),
  response: labViewSchema,
  problems: ['invalid-input', 'not-found'],
});
