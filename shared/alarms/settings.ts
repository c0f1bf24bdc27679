import * as z from 'zod';
import { idSchema } from '../contracts/common';
import { localTimeSchema } from '../schedule/plan';

/** Whom the alarms of a lab ring, in which order, and when nobody wants to be rung. */

export const hoursSchema = z
  .strictObject({ from: localTimeSchema, until: localTimeSchema })
  .refine(({ from, until }) => from !== until, { path: ['until'], message: 'from and until are the same time of day' });

export const callSettingsSchema = z.strictObject({
  /** Who is rung, one after the other; nobody is named twice. */
  order: z
    .array(
      z.strictObject({
        userId: idSchema,
        /** Can be at the rig within half an hour. */
        near: z.boolean().default(false),
      }),
    )
    .max(20)
    .refine((order) => new Set(order.map(({ userId }) => userId)).size === order.length, 'each person is named once'),
  /** Whoever started the run is rung before the others. */
  starterFirst: z.boolean().default(true),
  /** Whoever does not acknowledge in this time is followed by the next, min. */
  nextAfterMin: z.number().int().min(1).max(120).default(10),
  /** When what can wait is told, in the lab's zone. */
  morningAt: localTimeSchema.default('07:00'),
});
export type CallSettings = z.infer<typeof callSettingsSchema>;

export const usualCallSettings: CallSettings = { order: [], starterFirst: true, nextAfterMin: 10, morningAt: '07:00' };

/** What a person of the lab set for himself or herself. */
export const ownCallSchema = z.strictObject({
  /** Do not ring, in the lab's zone; may pass midnight; null: at any hour. */
  doNotRing: hoursSchema.nullable(),
});
export type OwnCall = z.infer<typeof ownCallSchema>;
