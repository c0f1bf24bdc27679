import type { SettleStep, Step, WaitStep } from './document';

/** A step that ends by what is measured: over how long it has to be so, and when it is given up. */

export type Otherwise = 'hold' | 'continue' | 'stop';

export interface Wait {
  /** Channel that is looked at; null: the deflection. */
  channel: string | null;
  /** Over how long it has to be so, s: before that nothing can be met. */
  windowS: number;
  /** When it is given up, s after the beginning. */
  atMostS: number;
  otherwise: Otherwise;
}

const defaults = { settleAtMostS: 14_400, waitForS: 60, waitAtMostS: 5400 } as const;

export type CalmStep = SettleStep & { calmWhen: NonNullable<SettleStep['calmWhen']> };
export type ChannelStep = WaitStep & { until: Extract<WaitStep['until'], { channel: string }> };
export const isCalm = (step: Step): step is CalmStep => step.kind === 'settle' && step.calmWhen !== undefined;
export const isChannelWait = (step: Step): step is ChannelStep => step.kind === 'wait' && 'channel' in step.until;

/** The wait of a settle until calm or a wait for a channel; null for any other step. */
export function waitOf(step: Step): Wait | null {
  if (isCalm(step)) {
    const { calmWhen, atMost_s: atMostS = defaults.settleAtMostS, otherwise = 'hold' } = step;
    return { channel: null, windowS: calmWhen.window_s, atMostS, otherwise };
  }
  if (!isChannelWait(step)) return null;
  const { until, atMost_s: atMostS = defaults.waitAtMostS, otherwise = 'hold' } = step;
  return { channel: until.channel, windowS: until.for_s ?? defaults.waitForS, atMostS, otherwise };
}
