import * as z from 'zod';
import { calibrationSchema } from './calibrations';
import { idSchema, instantSchema } from './common';
import { defineRoute } from './route';

export const channelViewSchema = z.strictObject({
  id: idSchema,
  rigId: idSchema,
  name: z.string(),
  quantity: z.string(),
  unit: z.string(),
  role: z.enum(['deflection', 'environment', 'turntable']),
  source: z.enum(['simulated', 'import', 'stream']),
  /** Samples a second that are to be expected of it; null where nothing is. */
  rateHz: z.number().nullable(),
});
export type ChannelView = z.infer<typeof channelViewSchema>;

/** How a CSV is to be read. Columns are counted from 0. */
export const importMappingSchema = z.strictObject({
  /** UTF-8 where nothing is said. A byte order mark counts for more. */
  encoding: z.enum(['utf-8', 'utf-16le', 'utf-16be', 'latin-1']).optional(),
  /** One sign that is no part of a number, a name or a time. */
  delimiter: z
    .string()
    .regex(/^[^\p{L}\p{N}"'+.\-:#\r\n\u0000]$/u, 'one sign such as , ; | or a tab, no letter, digit, quotation mark or sign of a number'),
  decimal: z.enum(['.', ',']),
  headerRow: z.boolean(),
  timeColumn: z.number().int().nonnegative(),
  timeFormat: z.enum(['iso', 'epoch-s', 'epoch-ms', 'elapsed-s']),
  /** The instant of elapsed time 0; needed for `elapsed-s` only. */
  elapsedFrom: instantSchema.optional(),
  /** For `iso`: times that name no zone are UTC. Absent, without `timeZone`: such times are refused. */
  timesWithoutZoneAreUtc: z.boolean().optional(),
  /** For `iso`: times that name no zone are what the clocks of this IANA zone show, `Europe/Oslo` for example. */
  timeZone: z.string().min(1).max(64).optional(),
  valueColumn: z.number().int().nonnegative(),
  unit: z.enum(['rad', 'mrad', 'urad', 'm', 'mm']),
});
export type ImportMapping = z.infer<typeof importMappingSchema>;

/** What becomes of whatever the dry run found: nothing is decided unasked. */
export const importChoicesSchema = z.strictObject({
  /** Where the channel holds another value at the same instant: nothing at all is stored, the stored one stays, that of the file counts. */
  sameInstant: z.enum(['refuse', 'keep', 'replace']).default('refuse'),
  /** Rows of the file that fall among samples which the channel holds at other instants: nothing at all is stored, both stay side by side, such rows are left out. */
  among: z.enum(['refuse', 'both', 'leave-out']).default('refuse'),
  /** Rows whose value lies beyond the reach of the pendulum: the file is refused, such rows are left out. */
  outOfReach: z.enum(['refuse', 'leave-out']).default('refuse'),
  /** Rows from before the run began or after it ended. */
  outsideRun: z.enum(['store', 'leave-out']).default('store'),
});
export type ImportChoices = z.output<typeof importChoicesSchema>;

/** Row numbers count lines of the file from 1, as an editor shows them. */
export const importProblemSchema = z.strictObject({ row: z.number().int().nullable(), column: z.string().nullable(), message: z.string() });

export const importPreviewSchema = z.strictObject({
  columns: z.array(z.strictObject({ index: z.number().int(), name: z.string(), sample: z.string() })),
  /** The first rows as read with the mapping's delimiter. */
  rows: z.array(z.array(z.string())),
  mapping: importMappingSchema,
  /** Keys of `mapping` that could not be told from the file and must be stated, for example `unit`. */
  ambiguous: z.array(z.string()),
});
const stretchSchema = { fromAt: instantSchema, toAt: instantSchema };

/** How the rows that could be read stand to the run and to what the channel of that name holds already. */
export const importFindingsSchema = z.strictObject({
  /** Samples of the channel from the first to the last instant of the file. */
  held: z.number().int(),
  /** Rows at instants of which the channel holds nothing, the same value, another value. */
  fresh: z.number().int(),
  equal: z.number().int(),
  different: z.number().int(),
  /** The first 20 of those with another value; `stored` and `inFile` in `unit` of the mapping. */
  differing: z.array(z.strictObject({ row: z.number().int(), at: instantSchema, stored: z.number(), inFile: z.number() })),
  /** Another value stands where a frozen evaluation does: it cannot be replaced. */
  frozen: z.boolean(),
  /** Fresh rows among samples of other instants, and the first 20 stretches in which they lie. */
  among: z.strictObject({
    rows: z.number().int(),
    stretches: z.array(z.strictObject({ ...stretchSchema, rows: z.number().int(), held: z.number().int() })),
  }),
  /** Rows beyond the reach of the pendulum, which are problems too. `leavable`: few enough to be left out, else the unit is wrong. */
  outOfReach: z.strictObject({ rows: z.number().int(), leavable: z.boolean() }),
  outsideRun: z.strictObject({ before: z.number().int(), after: z.number().int() }),
  /** Stretches without a row within the file, the 20 longest; `held`: samples that the channel has there. */
  gaps: z.strictObject({
    count: z.number().int(),
    totalS: z.number(),
    longest: z.array(z.strictObject({ ...stretchSchema, held: z.number().int() })),
  }),
});
export type ImportFindings = z.infer<typeof importFindingsSchema>;

export const importCheckSchema = z.strictObject({
  ok: z.boolean(),
  rows: z.number().int(),
  firstAt: instantSchema.nullable(),
  lastAt: instantSchema.nullable(),
  medianIntervalS: z.number().nullable(),
  /** The first 100 problems, and how many there are in all. */
  problems: z.array(importProblemSchema),
  problemCount: z.number().int(),
  /** In words: how the data lie against the run, for example `covers 100 % of the run` or `covers 40 s of the run’s 2 h 48 min`. */
  overlap: z.string(),
  findings: importFindingsSchema,
});
export type ImportCheck = z.infer<typeof importCheckSchema>;

const channelNameSchema = z.string().min(1).max(80);
export const importPath = '/labs/:labId/imports/:importId';

export const listChannels = defineRoute({
  name: 'listChannels',
  summary: 'Channels of a rig',
  method: 'GET',
  path: '/labs/:labId/rigs/:rigId/channels',
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(channelViewSchema) }),
  problems: ['not-found'],
});
export const checkImport = defineRoute({
  name: 'checkImport',
  summary: 'Read the whole file with a mapping, list every problem by row, compare it with what the channel holds; stores nothing',
  method: 'POST',
  path: `${importPath}/check`,
  access: 'data.import',
  status: 200,
  body: z.strictObject({ mapping: importMappingSchema, channelName: channelNameSchema }),
  response: importCheckSchema,
  problems: ['invalid-input', 'not-found', 'unreadable-data', 'not-possible-now', 'already-exists', 'files-away'],
});
export const commitImport = defineRoute({
  name: 'commitImport',
  summary: 'Store the samples, all or none',
  method: 'POST',
  path: `${importPath}/commit`,
  access: 'data.import',
  status: 200,
  idempotent: true,
  body: z.strictObject({ mapping: importMappingSchema, channelName: channelNameSchema, choices: importChoicesSchema.prefault({}) }),
  /** `known`: instants that the channel held already, `other` of them with another value; `leftOut`: rows that were left out as was chosen. */
  response: z.strictObject({
    channel: channelViewSchema,
    stored: z.number().int(),
    known: z.number().int(),
    other: z.number().int(),
    leftOut: z.number().int(),
  }),
  problems: ['invalid-input', 'not-found', 'unreadable-data', 'not-possible-now', 'already-exists', 'files-away'],
});
/** Both ends belong to the window; without one it reaches as far as the channel does. */
const exportEndSchema = z.coerce.number().min(0).max(Date.UTC(9999, 0)).optional();
export const exportQuerySchema = z.strictObject({ fromUtcMs: exportEndSchema, toUtcMs: exportEndSchema });
const channelPath = '/labs/:labId/channels/:channelId';

export const exportSamplesCsv = defineRoute({
  name: 'exportSamplesCsv',
  summary: 'Every sample of a channel within a window as CSV: instants in UTC to the microsecond, values that read back to the same number',
  method: 'GET',
  path: `${channelPath}/samples.csv`,
  access: 'read',
  status: 200,
  query: exportQuerySchema,
  produces: 'text/csv',
  problems: ['invalid-input', 'not-found'],
});
export const exportSamplesNdjson = defineRoute({
  name: 'exportSamplesNdjson',
  summary: 'The same as lines of JSON, as devices send them',
  method: 'GET',
  path: `${channelPath}/samples.ndjson`,
  access: 'read',
  status: 200,
  query: exportQuerySchema,
  produces: 'application/x-ndjson',
  problems: ['invalid-input', 'not-found'],
});
export const readSamples = defineRoute({
  name: 'readSamples',
  summary: 'Samples of a channel within a run for a plot: least and greatest in each of `points` / 2 intervals',
  method: 'GET',
  path: '/labs/:labId/runs/:runId/samples',
  access: 'read',
  status: 200,
  query: z.strictObject({
    channelId: idSchema.optional(),
    fromUtcMs: z.coerce.number().optional(),
    toUtcMs: z.coerce.number().optional(),
    points: z.coerce.number().int().min(10).max(4000).default(2000),
  }),
  response: z.strictObject({
    channel: channelViewSchema.nullable(),
    channels: z.array(channelViewSchema),
    utcMs: z.array(z.number()),
    value: z.array(z.number()),
    total: z.number().int(),
    /** By which the values were calibrated; null: they are as read. */
    calibration: calibrationSchema.extend({ revision: z.number().int() }).nullable(),
    /** Stretches of the window of which summaries of 2 s alone are left. */
    thinned: z.array(z.strictObject({ fromUtcMs: z.number(), toUtcMs: z.number() })),
  }),
  problems: ['invalid-input', 'not-found'],
});
