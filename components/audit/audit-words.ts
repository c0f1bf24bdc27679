import { formatFixed } from '@/shared/lib/format-number';
import { server, type AuditCheck } from '@/shared/contracts/audit';

/** The audit chain in words. */

const areas: Readonly<Record<string, string>> = {
  alarm: 'Alarms',
  'calendar-feed': 'Calendar feeds',
  'device-token': 'Device tokens',
  broker: 'Brokers',
  camera: 'Cameras',
  'door-card': 'Door cards',
  job: 'Given-up jobs',
  lab: 'The lab',
  member: 'Members',
  person: 'Accounts',
  protocol: 'Protocols',
  rig: 'Rigs',
  run: 'Runs',
  samples: 'Samples',
  schedule: 'Schedules',
};

const areaOf = (kind: string) => kind.split('.')[0] ?? kind;
const plain = (words: string) => words.replaceAll('-', ' ');
const capital = (words: string) => words.charAt(0).toUpperCase() + words.slice(1);

/** `run.hold-asked`: Run: hold asked. */
export function kindWords(kind: string): string {
  const [area = '', ...act] = kind.split('.');
  return capital(act.length === 0 ? plain(area) : `${plain(area)}: ${plain(act.join('.'))}`);
}

export const everything = 'everything';

/** What can be chosen: everything, whole areas, and each kind under its area. */
export function kindChoices(kinds: readonly string[]): { value: string; label: string }[] {
  const found = [...new Set(kinds.map(areaOf))].sort();
  return [
    { value: everything, label: 'everything' },
    ...found.flatMap((area) => [
      { value: area, label: `${areas[area] ?? capital(plain(area))}, all` },
      ...kinds.filter((kind) => areaOf(kind) === area && kind !== area).map((kind) => ({ value: kind, label: `– ${kindWords(kind)}` })),
    ]),
  ];
}

export const personChoices = (people: AuditCheck['people']): { value: string; label: string }[] => [
  { value: everything, label: 'everybody' },
  ...people.map(({ id, name }) => ({ value: id, label: id === server ? 'the server itself' : name })),
];

const names: Readonly<Record<string, string>> = { from: 'before', to: 'after' };
const said = (name: string) => names[name] ?? name.replaceAll(/[A-Z]/g, (letter) => ` ${letter.toLowerCase()}`).replace(/ id$/, '');
const valueWords = (value: unknown): string =>
  typeof value === 'boolean' ? (value ? 'yes' : 'no') : typeof value === 'object' ? JSON.stringify(value) : String(value);

/** What was done to what, in a line; who did it stands beside it. */
export const auditFacts = (data: Record<string, unknown>): string =>
  Object.entries(data)
    .filter(([name, value]) => name !== 'who' && value !== null && value !== '')
    .map(([name, value]) => `${said(name)} ${valueWords(value)}`)
    .join(' · ');

const whole = (count: number) => formatFixed(count, { decimals: 0 });

export interface CheckWords {
  ok: boolean;
  head: string;
  more: string;
}

/** How far the chain is whole. */
export function checkWords({ valid, upToSeq, broken, complete }: AuditCheck): CheckWords {
  const upTo = whole(upToSeq);
  if (!valid && broken !== null)
    return {
      ok: false,
      head: `The chain is broken at entry ${whole(broken.seq)}`,
      more: `${capital(broken.why)}. ${upToSeq === 0 ? 'No entry before it is right.' : `It is whole up to entry ${upTo}.`} Keep a backup as it is now, and compare it with older ones.`,
    };
  if (upToSeq === 0) return { ok: true, head: 'Nothing stands in the chain yet', more: 'What people do is entered from now on.' };
  return {
    ok: true,
    head: `The chain is whole up to entry ${upTo}`,
    more: complete
      ? 'That is its last entry: none was changed, taken out or put in since.'
      : 'It goes on from there: the command audit-verify follows the rest.',
  };
}
