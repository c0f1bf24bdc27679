import type { MorningSheet } from '../contracts/morning';
import { formatDeflectionUncertain } from '../lib/format-angle';
import { formatDuration } from '../lib/format-duration';
import { formatPercent, UNIT_OF_G } from '../lib/format-number';
import { formatClockWithZone } from '../lib/format-time';
import { formatUncertain } from '../lib/format-uncertain';

/** The morning sheet in words, the same on the page and in the mail. */

/** As near to the plan as a person would call punctual (no source). */
const punctualS = 120;

/** `as planned`, or by how much it ended before or after the plan; empty where the end was open or is still to come. */
export function planWords({ plannedEndAt }: Pick<MorningSheet, 'plannedEndAt'>, endedAt: string | null): string {
  if (plannedEndAt === null || endedAt === null) return '';
  const lateS = (Date.parse(endedAt) - Date.parse(plannedEndAt)) / 1000;
  if (Math.abs(lateS) <= punctualS) return 'as planned';
  return `${formatDuration(Math.abs(lateS))} ${lateS > 0 ? 'after' : 'before'} the plan`;
}

/** How many dwells there were to be good: those planned, and those that made up for others. */
export const dwellsIn = ({ planned, done }: MorningSheet['dwells']): number => Math.max(planned, done);

/** `31 of 32 dwells are good; 12 min brought nothing that counts: held`. */
export function dwellWords({ dwells, lost }: Pick<MorningSheet, 'dwells' | 'lost'>): string {
  const good = `${dwells.good} of ${dwellsIn(dwells)} dwells are good`;
  const { total, causes } = lostWords(lost);
  return causes === '' ? `${good}, ${total}` : `${good}; ${total}: ${causes}`;
}

/** How long nothing came that counts, and of what; no causes where no time was lost. */
export function lostWords(lost: MorningSheet['lost']): { total: string; causes: string } {
  if (lost.length === 0) return { total: 'no time was lost', causes: '' };
  const total = lost.reduce((sum, { s }) => sum + s, 0);
  const causes = lost.map(({ words, s }) => (lost.length === 1 ? words : `${words} ${formatDuration(s)}`)).join(', ');
  return { total: `${formatDuration(total)} brought nothing that counts`, causes };
}

const marks = new Map([
  [true, '✓'],
  [false, '✗'],
  [null, '?'],
]);
const acts = { go: '→', wait: '…', first: '!' } as const;

interface Ended {
  /** `Finished`, `Stopped`, `Failed`, `Held`. */
  state: string;
  endedAt: string | null;
  /** Why, where it did not finish. */
  reason: string;
  timeZone: string;
}

/** The sheet as lines of a mail, in the order in which people ask. */
export function morningLines(sheet: MorningSheet, { state, endedAt, reason, timeZone }: Ended): string[] {
  const at = endedAt === null ? '' : ` ${formatClockWithZone(Date.parse(endedAt), { timeZone, weekday: true })}`;
  const plan = planWords(sheet, endedAt);
  const { tonight, G } = sheet;
  return [
    `${state}${at}${plan === '' ? '' : `, ${plan}`}.${reason === '' ? '' : ` ${reason}`}`,
    'May I go in? The page of the run says what moves and whether the rig is armed: look there first.',
    ...sheet.ticks.map(({ ok, words }) => `${marks.get(ok) ?? '?'} ${words}.`),
    `${dwellWords(sheet)}.`,
    ...(tonight === null ? [] : [`Near − far: ${formatDeflectionUncertain(tonight.reversal_rad)}.`]),
    ...(G === null
      ? []
      : [
          `G: ${formatUncertain({ ...G, unit: UNIT_OF_G })}${G.u === null ? '' : `, standard uncertainty ${formatPercent(G.u / Math.abs(G.value))}`}.`,
        ]),
    ...sheet.next.map(({ act, words }) => `${acts[act]} ${words}`),
  ];
}
