import * as z from 'zod';

/** Limits of a channel: its level, its slope, its span, its silence. */

const shared = {
  /** The limit must be passed this long before the alarm is raised, s; for deflection at least one period. */
  forS: z.number().min(0).max(86_400).default(2),
  /** Whom it tells. */
  rings: z.enum(['allowed', 'morning', 'never']).default('morning'),
};

const windowS = z.number().min(10).max(86_400);

export const channelLimitSchema = z.discriminatedUnion('kind', [
  z
    .strictObject({
      kind: z.literal('level'),
      /** In the channel's unit; null: no limit on this side. */
      least: z.number().nullable(),
      greatest: z.number().nullable(),
      /** Of the distance between the limits (of the greatest magnitude where there is one limit), by which it must come back. */
      deadBand: z.number().min(0).max(0.5).default(0.02),
      ...shared,
    })
    .refine(({ least, greatest }) => least !== null || greatest !== null, { path: ['greatest'], message: 'give one limit at least' })
    .refine(({ least, greatest }) => least === null || greatest === null || least < greatest, {
      path: ['greatest'],
      message: 'the greatest must be above the least',
    }),
  z.strictObject({
    kind: z.literal('slope'),
    /** Greatest change to either side, in the channel's unit per hour, fitted over the last `windowS`. */
    greatestPerH: z.number().positive(),
    windowS: windowS.default(600),
    deadBand: z.number().min(0).max(0.5).default(0.02),
    ...shared,
  }),
  z.strictObject({
    kind: z.literal('span'),
    /** Greatest minus least reading of the last `windowS`, in the channel's unit. */
    atMost: z.number().positive(),
    windowS: windowS.default(3600),
    deadBand: z.number().min(0).max(0.5).default(0.02),
    ...shared,
  }),
  z.strictObject({
    kind: z.literal('silence'),
    /** Longest time without a sample, s. */
    atMostS: z.number().min(5).max(604_800),
    rings: shared.rings,
  }),
]);
export type ChannelLimit = z.infer<typeof channelLimitSchema>;

/** What is known of a channel now. */
export interface ChannelNow {
  utcMs: number;
  last: { utcMs: number; value: number } | null;
  /** Straight line through the last `windowS`, in the channel's unit per hour; null where there are too few samples. */
  slopePerH: number | null;
  /** Greatest minus least of the last `windowS`, in the channel's unit; null where there is no sample. */
  span: number | null;
  /** Whether the alarm is on, so that the dead band counts. */
  met: boolean;
}

/** Whether the limit is passed. What is not known passes no limit but that of silence. */
export function passesLimit(limit: ChannelLimit, { utcMs, last, slopePerH, span, met }: ChannelNow): boolean {
  switch (limit.kind) {
    case 'silence':
      return last !== null && utcMs - last.utcMs > 1000 * limit.atMostS;
    case 'slope':
      return slopePerH !== null && Math.abs(slopePerH) > limit.greatestPerH * (met ? 1 - limit.deadBand : 1);
    case 'span':
      return span !== null && span > limit.atMost * (met ? 1 - limit.deadBand : 1);
    case 'level':
      return last !== null && isBeyond(limit, last.value, met);
  }
}

function isBeyond({ least, greatest, deadBand }: Extract<ChannelLimit, { kind: 'level' }>, value: number, met: boolean): boolean {
  const span = least !== null && greatest !== null ? greatest - least : Math.abs(greatest ?? least ?? 0);
  const back = met ? deadBand * span : 0;
  return (greatest !== null && value > greatest - back) || (least !== null && value < least + back);
}
