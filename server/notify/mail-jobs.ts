import type { Clock } from '../interfaces/clock';
import type { JobHandlers } from '../interfaces/jobs';
import type { MailPort } from '../interfaces/mail';
import type { Database } from '../store/database';
import { openInvitationById, setInvitationToken } from '../store/invitations';
import {
  changedMailSchema,
  invitationMailSchema,
  mailKinds,
  resetMailSchema,
  scheduleMailSchema,
  type ChangedMail,
  type InvitationMail,
  type ResetMail,
  type ScheduleMail,
} from '../store/mail-requests';
import { createPasswordReset } from '../store/password-resets';
import { userByEmail, userById } from '../store/people';
import { startsBetween } from '../store/schedule-starts';
import { findSchedule } from '../store/schedules';
import { invitationMail, missedStartMail, passwordChangedMail, passwordResetMail, unarmedStartMail } from './mails';

const resetValidMinutes = 30;

export interface MailJobParts {
  db: Database;
  clock: Pick<Clock, 'utcMs'>;
  mail: MailPort;
  newToken(): string;
  sha256(text: string): string;
}

/**
 * The handlers of all mail jobs, by kind. A job never holds a token: its handler makes the token, keeps the hash and
 * sends the link, so that nobody who reads the database can use it. A retry makes a new one, and only the newest works.
 */
export function mailJobs(parts: MailJobParts): JobHandlers {
  return {
    [mailKinds.invitation]: (job) => sendInvitation(parts, invitationMailSchema.parse(job.payload)),
    [mailKinds.passwordReset]: (job) => sendPasswordReset(parts, resetMailSchema.parse(job.payload)),
    [mailKinds.passwordChanged]: (job) => sendPasswordChanged(parts, changedMailSchema.parse(job.payload)),
    [mailKinds.schedule]: (job) => sendSchedule(parts, scheduleMailSchema.parse(job.payload)),
  };
}

async function sendInvitation(
  { db, clock, mail, newToken, sha256 }: MailJobParts,
  { labId, invitationId, origin }: InvitationMail,
): Promise<void> {
  const invitation = await openInvitationById(db, { labId, id: invitationId, nowUtcMs: clock.utcMs() });
  if (invitation === null) return;
  const token = newToken();
  await setInvitationToken(db, { labId, id: invitationId, tokenHash: sha256(token) });
  const { email, labName, timeZone, role, invitedBy, expiresAt } = invitation;
  await mail.send(
    invitationMail({ to: email, labName, timeZone, role, invitedBy, expiresAtUtcMs: expiresAt, link: `${origin}/invitations/${token}` }),
  );
}

async function sendPasswordReset({ db, clock, mail, newToken, sha256 }: MailJobParts, { email, origin }: ResetMail): Promise<void> {
  const user = await userByEmail(db, email);
  if (user === null) return;
  const token = newToken();
  const nowUtcMs = clock.utcMs();
  await db.transaction((tx) =>
    createPasswordReset(tx, { userId: user.id, tokenHash: sha256(token), nowUtcMs, expiresAtUtcMs: nowUtcMs + resetValidMinutes * 60_000 }),
  );
  await mail.send(
    passwordResetMail({
      to: user.email,
      name: user.name,
      link: `${origin}/reset-password?token=${token}`,
      validMinutes: resetValidMinutes,
    }),
  );
}

async function sendPasswordChanged({ db, mail }: MailJobParts, { userId, atUtcMs }: ChangedMail): Promise<void> {
  const user = await userById(db, userId);
  if (user === null) return;
  await mail.send(
    passwordChangedMail({ to: user.email, name: user.name, at: `${new Date(atUtcMs).toISOString().slice(0, 16).replace('T', ' ')} UTC` }),
  );
}

/** To whoever made the schedule; a start that was skipped or that passed meanwhile needs no warning any more. */
async function sendSchedule({ db, clock, mail }: MailJobParts, { labId, scheduleId, dueAt, what }: ScheduleMail): Promise<void> {
  const schedule = await findSchedule(db, labId, scheduleId);
  const user = schedule === null ? null : await userById(db, schedule.madeById);
  if (schedule === null || user === null) return;
  const [row] = await startsBetween(db, labId, { scheduleIds: [scheduleId], fromUtcMs: dueAt, toUtcMs: dueAt });
  const { rigName, protocolName, timeZone } = schedule;
  const start = { to: user.email, name: user.name, rigName, protocolName, dueAtUtcMs: dueAt, timeZone };
  if (what === 'missed') await mail.send(missedStartMail({ ...start, why: row?.why ?? '' }));
  else if (row?.outcome == null && schedule.state === 'active' && clock.utcMs() < dueAt) await mail.send(unarmedStartMail(start));
}
