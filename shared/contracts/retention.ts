import * as z from 'zod';
import { idSchema, instantSchema } from './common';
import { channelViewSchema, exportQuerySchema } from './data';
import { defineRoute } from './route';

/** How long samples are kept at their full rate. Older ones are thinned to their summaries, except where runs need them. */

/** No shorter, so that what comes late still finds its place. */
export const fewestDays = 7;
export const mostDays = 36_500;
const daysSchema = z.number().int().min(fewestDays, 'at least 7 days').max(mostDays);

const ruleSchema = z.strictObject({
  /** Of a channel: as the lab does. */
  asLab: z.boolean(),
  /** Null: for ever. */
  keepDays: z.number().int().nullable(),
  decidedAt: instantSchema,
  decidedBy: z.string(),
});
export type RetentionRuleView = z.infer<typeof ruleSchema>;

const keptChannelSchema = z.strictObject({
  channel: channelViewSchema,
  rigName: z.string(),
  /** Its own; null where it goes by that of the lab and nobody said so. */
  rule: ruleSchema.nullable(),
  /** What it goes by; null: for ever. */
  keepDays: z.number().int().nullable(),
  /** From when on it is gone by; null where nobody decided anything. */
  holdsFrom: instantSchema.nullable(),
  /** What was taken away so far, and from when to when summaries alone are left, runs left out. */
  thinned: z.strictObject({ samples: z.number().int(), fromAt: instantSchema, toAt: instantSchema }).nullable(),
});
export type KeptChannel = z.infer<typeof keptChannelSchema>;

const path = '/labs/:labId/retention';

export const getRetention = defineRoute({
  name: 'getRetention',
  summary: 'How long samples are kept: the rule of the lab, those of its channels, and what was thinned so far',
  method: 'GET',
  path,
  access: 'read',
  status: 200,
  response: z.strictObject({ lab: ruleSchema.nullable(), channels: z.array(keptChannelSchema) }),
  problems: ['not-found'],
});
export const tryRetention = defineRoute({
  name: 'tryRetention',
  summary: 'How many samples a rule would take away now, of a channel or of all that go by the rule of the lab; changes nothing',
  method: 'GET',
  path: `${path}/dry-run`,
  access: 'read',
  status: 200,
  query: z.strictObject({ channelId: idSchema.optional(), keepDays: z.coerce.number().pipe(daysSchema) }),
  response: z.strictObject({
    samples: z.number().int(),
    /** The stretches that hold them lie between; null where there is none. */
    fromAt: instantSchema.nullable(),
    toAt: instantSchema.nullable(),
    /** Samples of that age that stay, since they lie within runs or an hour about them. */
    kept: z.number().int(),
    /** Channels that the rule would hold for. */
    channels: z.number().int(),
  }),
  problems: ['invalid-input', 'not-found'],
});
export const decideRetention = defineRoute({
  name: 'decideRetention',
  summary: 'Decide how long samples of a channel are kept, or those of all that have no rule of their own; takes hold a day later',
  method: 'PUT',
  path,
  access: 'data.retention',
  status: 204,
  body: z
    .strictObject({
      /** Null: the rule of the lab. */
      channelId: idSchema.nullable(),
      keep: z.union([z.literal('for-ever'), z.literal('as-lab'), daysSchema], { error: '“for-ever”, “as-lab” or 7 to 36500 days' }),
    })
    .refine(({ channelId, keep }) => channelId !== null || keep !== 'as-lab', { path: ['keep'], message: 'the lab has nobody to follow' }),
  problems: ['invalid-input', 'not-found'],
});
export const exportSummariesCsv = defineRoute({
  name: 'exportSummariesCsv',
  summary: 'What is left of a channel where it was thinned: count, mean, least and greatest of each 2 s, as CSV',
  method: 'GET',
  path: '/labs/:labId/channels/:channelId/summaries.csv',
  access: 'read',
  status: 200,
  query: exportQuerySchema,
  produces: 'text/csv',
  problems: ['invalid-input', 'not-found'],
});
