/** The five roles of a lab and what each may do: one typed matrix from which checks, docs and tests are made. */

export const roles = ['owner', 'keeper', 'operator', 'analyst', 'viewer'] as const;
export type Role = (typeof roles)[number];

const all = roles;
const upTo = (last: Role): readonly Role[] => roles.slice(0, roles.indexOf(last) + 1);

/** An act is what a route does in the words of the lab; each route names exactly one. */
export const acts = {
  'members.manage': ['owner'],
  'lab.settings': ['owner'],
  'tokens.manage': ['owner'],
  'rig.edit': upTo('keeper'),
  'rig.arm': upTo('operator'),
  'cautions.sign': upTo('operator'),
  'lock.own': upTo('operator'),
  'lock.override': ['owner'],
  'protocol.write': upTo('operator'),
  'run.start': upTo('operator'),
  'run.resume': upTo('operator'),
  'prompt.confirm': upTo('operator'),
  'run.hold': all,
  'run.stop': all,
  'alarm.acknowledge': upTo('analyst'),
  'alarm.shelve': upTo('operator'),
  'data.import': upTo('analyst'),
  'data.annotate': upTo('analyst'),
  'data.exclude': upTo('analyst'),
  'data.retention': upTo('keeper'),
  evaluate: upTo('analyst'),
  read: all,
} as const satisfies Record<string, readonly Role[]>;

export type Act = keyof typeof acts;

/** Whether `role` may do `act`. */
export function may(role: Role, act: Act): boolean {
  return (acts[act] as readonly Role[]).includes(role);
}
