import * as z from 'zod';

/** When a schedule starts its run: once, or again and again on days of the week, at a time of day in the lab's zone. */

export const weekdays = ['mon', 'tue', 'wed', 'thu', 'fri', 'sat', 'sun'] as const;
export type Weekday = (typeof weekdays)[number];

/** `HH:MM`, 24 hours. */
export const localTimeSchema = z.string().regex(/^([01]\d|2[0-3]):[0-5]\d$/, 'a time of day is written HH:MM, for example 22:00');
/** `YYYY-MM-DD` */
export const localDateSchema = z.iso.date('a day is written YYYY-MM-DD, for example 2031-02-14');

export const schedulePlanSchema = z.discriminatedUnion('kind', [
  z.strictObject({ kind: z.literal('once'), date: localDateSchema, time: localTimeSchema }),
  z
    .strictObject({
      kind: z.literal('weekly'),
      days: z
        .array(z.enum(weekdays))
        .min(1, 'choose one day at least')
        .max(7)
        .refine((days) => new Set(days).size === days.length, 'each day is named once'),
      time: localTimeSchema,
      /** First and last local day on which it may start; null: without an end. */
      from: localDateSchema,
      until: localDateSchema.nullable(),
    })
    .refine(({ from, until }) => until === null || until >= from, { path: ['until'], message: 'the last day lies before the first' }),
]);
export type SchedulePlan = z.infer<typeof schedulePlanSchema>;

/** The hours in which the room is quiet, and the days on which no scheduled run may be in it. */
export const roomHoursSchema = z.strictObject({
  /** A run may go on only between these times of day; null: at any time. The window may pass midnight. */
  nightWindow: z.strictObject({ from: localTimeSchema, until: localTimeSchema }).nullable(),
  /** Whole days of the lab, from midnight to midnight: no scheduled run begins on one or goes on into it. */
  blackouts: z
    .array(
      z
        .strictObject({ from: localDateSchema, until: localDateSchema, why: z.string().trim().min(1, 'say why').max(200) })
        .refine(({ from, until }) => until >= from, { path: ['until'], message: 'the last day lies before the first' }),
    )
    .max(200),
});
export type RoomHours = z.infer<typeof roomHoursSchema>;

export const openHours: RoomHours = { nightWindow: null, blackouts: [] };
