import * as z from 'zod';
import type { Handle } from './database';
import { enqueueJob } from './jobs';

/** Mails asked for in the transaction of their cause; `server/notify` sends them afterwards, with retries. */
export const mailKinds = {
  invitation: 'mail.invitation',
  passwordReset: 'mail.password-reset',
  passwordChanged: 'mail.password-changed',
  schedule: 'mail.schedule',
} as const;

/** Address of the server as people reach it, without a slash at the end. */
const origin = z.string();
export const invitationMailSchema = z.strictObject({ labId: z.string(), invitationId: z.string(), origin });
export const resetMailSchema = z.strictObject({ email: z.string(), origin });
export const changedMailSchema = z.strictObject({ userId: z.string(), atUtcMs: z.number() });
/** A start that was missed, or that will be because nobody armed the rig. */
export const scheduleMailSchema = z.strictObject({
  labId: z.string(),
  scheduleId: z.string(),
  dueAt: z.number(),
  what: z.enum(['missed', 'not-armed']),
});
export type InvitationMail = z.infer<typeof invitationMailSchema>;
export type ResetMail = z.infer<typeof resetMailSchema>;
export type ChangedMail = z.infer<typeof changedMailSchema>;
export type ScheduleMail = z.infer<typeof scheduleMailSchema>;

export const askForInvitationMail = (db: Handle, mail: InvitationMail, nowUtcMs: number) =>
  enqueueJob(db, { kind: mailKinds.invitation, payload: mail, labId: mail.labId, nowUtcMs });

/** Asked for known and unknown addresses alike, so that the time of the answer tells nothing; the sender looks it up. */
export const askForPasswordResetMail = (db: Handle, mail: ResetMail, nowUtcMs: number) =>
  enqueueJob(db, { kind: mailKinds.passwordReset, payload: mail, labId: null, nowUtcMs, maxAttempts: 4 });

export const askForPasswordChangedMail = (db: Handle, mail: ChangedMail, nowUtcMs: number) =>
  enqueueJob(db, { kind: mailKinds.passwordChanged, payload: mail, labId: null, nowUtcMs });

export const askForScheduleMail = (db: Handle, mail: ScheduleMail, nowUtcMs: number) =>
  enqueueJob(db, { kind: mailKinds.schedule, payload: mail, labId: mail.labId, nowUtcMs });
