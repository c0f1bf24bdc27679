import { kindOf } from '../../store/alarms';
import type { Condition } from './rig-conditions';

/** What is news of the conditions that a look found. */

export const keyOf = ({ code, subject }: { code: string; subject: string }) => `${code} ${subject}`;

/** How long it must hold before it is an alarm, s. */
export const delayOf = ({ code, onDelayS }: { code: string; onDelayS?: number | null }): number => onDelayS ?? kindOf(code).onDelayS;

/** What two looks found; where both found the same, the first knows more of it. */
export const together = (first: readonly Condition[], second: readonly Condition[]): Condition[] => [
  ...first,
  ...second.filter((one) => !first.some((other) => keyOf(other) === keyOf(one))),
];

/**
 * It was not told yet, or it is an alarm sooner than as it was told.
 * @param told delays of what was told and holds, s, by kind and subject
 */
export const isNews = (condition: Condition, told: ReadonlyMap<string, number>): boolean =>
  delayOf(condition) < (told.get(keyOf(condition)) ?? Infinity);
