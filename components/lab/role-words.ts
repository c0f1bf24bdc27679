import { acts, roles, type Act, type Role } from '@/shared/contracts/roles';

/** The acts of the role matrix as a member of the lab would say them. */
const actWords: Record<Act, string> = {
  'members.manage': 'Manage members and invitations',
  'lab.settings': 'Change the settings of the lab',
  'tokens.manage': 'Make and revoke device tokens, add and remove brokers',
  'rig.edit': 'Change a rig, its link and its mass sets',
  'rig.arm': 'Arm a rig on site',
  'cautions.sign': 'Sign the cautions of a rig',
  'lock.own': 'Set and lift one\u2019s own personal lock',
  'lock.override': 'Lift the personal lock of somebody else, with a reason',
  'protocol.write': 'Write and issue protocols, rehearse',
  'run.start': 'Start a run',
  'run.resume': 'Resume a run',
  'prompt.confirm': 'Confirm a prompt',
  'run.hold': 'Hold a run',
  'run.stop': 'Stop a run',
  'alarm.acknowledge': 'Acknowledge an alarm, and say that its answer is done',
  'alarm.shelve': 'Shelve or reset an alarm',
  'data.import': 'Import data',
  'data.annotate': 'Write notes to the step log',
  'data.exclude': 'Exclude data with a reason, and withdraw it',
  'data.retention': 'Decide how long samples are kept',
  evaluate: 'Evaluate a run',
  read: 'Read everything',
};

export const roleOptions = roles.map((role) => ({ value: role, label: `${role[0]?.toUpperCase() ?? ''}${role.slice(1)}` }));

export const roleSummary: Record<Role, string> = {
  owner: 'everything, members and settings included',
  keeper: 'rigs, protocols, runs and data',
  operator: 'protocols, arming, runs and data',
  analyst: 'data and evaluation; hold and stop',
  viewer: 'reads; hold and stop',
};

/** The matrix as rows for a table: act in words, and for each role whether it may. */
export const matrixRows = (Object.keys(acts) as Act[]).map((act) => ({
  act,
  words: actWords[act],
  allowed: roles.map((role) => (acts[act] as readonly Role[]).includes(role)),
}));
