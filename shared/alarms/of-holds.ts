import type { AlarmCode } from './catalog';

/** Codes of a run's reason that are the alarm of the same name; any other reason of a hold is `held`, and a person's own hold is none. */
const byReason: Readonly<Record<string, AlarmCode>> = {
  'unexpected-motion': 'unexpected-motion',
  'stopped-at-rig': 'unexpected-motion',
  limit: 'limit',
  interlock: 'interlock',
  supply: 'supply',
  'controller-reset': 'controller-reset',
  'table-slipped': 'home-edge',
  'slip-found-homing': 'home-edge',
  'no-response': 'no-response',
  'no-deflection': 'no-deflection',
  excursion: 'excursion',
};
const byPeople = ['held-by-person', 'stopped-by-person', 'hold-after-dwell'];

/** The alarm that a hold for this reason is; null where a person asked for it. */
export function alarmOfHold(reasonCode: string): AlarmCode | null {
  if (byPeople.includes(reasonCode)) return null;
  if (reasonCode.startsWith('proof')) return 'proof-failed';
  return byReason[reasonCode] ?? 'held';
}
