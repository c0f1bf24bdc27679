import type { Role } from '@/shared/contracts/roles';
import { formatDayAndClock } from '@/shared/lib/format-time';
import type { Mail } from '../interfaces/mail';

/** The mails as people read them: plain text, one link, what happens if nothing is done. */

const may: Record<Role, string> = {
  owner: 'do everything, also manage members and settings',
  keeper: 'edit the rig, its limits and its mass sets, arm it, and do all that an operator does',
  operator: 'arm the rig, write protocols, start and resume runs',
  analyst: 'import data and evaluate runs',
  viewer: 'read everything',
};

const oneLine = (text: string) => text.replace(/\s+/g, ' ').trim();
const anybody = 'As every member you may hold or stop a run at any time.';

export function invitationMail(invitation: {
  to: string;
  labName: string;
  timeZone: string;
  role: Role;
  invitedBy: string;
  link: string;
  expiresAtUtcMs: number;
}): Mail {
  const lab = oneLine(invitation.labName);
  return {
    to: invitation.to,
    subject: `Invitation to ${lab}`,
    text: `${oneLine(invitation.invitedBy)} invites you to ${lab} on Evenfall as ${invitation.role}.

As ${invitation.role} you may ${may[invitation.role]}. ${anybody}

To join, open this link:

${invitation.link}

It can be used once, until ${formatDayAndClock(invitation.expiresAtUtcMs, invitation.timeZone)}. If you do not know the lab, do nothing: without you the invitation ends by itself.
`,
  };
}

export function passwordResetMail(reset: { to: string; name: string; link: string; validMinutes: number }): Mail {
  return {
    to: reset.to,
    subject: 'Set a new password for Evenfall',
    text: `Hello ${oneLine(reset.name)},

somebody, most likely you, asked for a new password for your Evenfall account. To set it, open this link:

${reset.link}

It can be used once, within ${String(reset.validMinutes)} minutes. Setting a new password ends all sessions of your account.

If it was not you, do nothing: your password stays as it is.
`,
  };
}

export function passwordChangedMail(change: { to: string; name: string; at: string }): Mail {
  return {
    to: change.to,
    subject: 'Your Evenfall password was changed',
    text: `Hello ${oneLine(change.name)},

the password of your Evenfall account was changed at ${change.at} and all its sessions were ended. Sign in with the new one.

If it was not you, ask for a new password at once ("Forgotten password" on the sign-in page) and tell an owner of your lab.
`,
  };
}

interface ScheduledStart {
  to: string;
  name: string;
  rigName: string;
  protocolName: string;
  dueAtUtcMs: number;
  timeZone: string;
}

export function missedStartMail({ to, name, rigName, protocolName, dueAtUtcMs, timeZone, why }: ScheduledStart & { why: string }): Mail {
  return {
    to,
    subject: `Not started: ${oneLine(protocolName)} on ${oneLine(rigName)}`,
    text: `Hello ${oneLine(name)},

the run of "${oneLine(protocolName)}" that you scheduled on ${oneLine(rigName)} for ${formatDayAndClock(dueAtUtcMs, timeZone)} was not started.

Why: ${oneLine(why)}

Nothing has moved. A missed start is not made up for; later starts of the schedule stand.
`,
  };
}

export function unarmedStartMail({ to, name, rigName, protocolName, dueAtUtcMs, timeZone }: ScheduledStart): Mail {
  return {
    to,
    subject: `Not armed yet: ${oneLine(rigName)}, ${oneLine(protocolName)}`,
    text: `Hello ${oneLine(name)},

the run of "${oneLine(protocolName)}" is scheduled on ${oneLine(rigName)} for ${formatDayAndClock(dueAtUtcMs, timeZone)}, but nobody has armed the rig until the end of that run.

A schedule does not arm: somebody has to be at the rig, see that all is clear, and arm it before that time. If nobody does, the start is missed and nothing moves.
`,
  };
}
