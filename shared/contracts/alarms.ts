import * as z from 'zod';
import { alarmStates } from '../alarms/machine';
import { channelLimitSchema } from '../alarms/limits';
import { idSchema, instantSchema, pageOf, pageQuerySchema } from './common';
import { defineRoute } from './route';

/** Alarms: conditions that need a timely answer of a person. Acknowledge (seen), confirm (done) and reset (clear a latch) are three acts. */

const actSchema = z.strictObject({ by: z.string(), at: instantSchema });

export const alarmViewSchema = z.strictObject({
  id: idSchema,
  code: z.string(),
  title: z.string(),
  cause: z.string(),
  consequence: z.string(),
  answer: z.string(),
  /** Time in which the answer still helps, min. */
  answerWithinMin: z.number(),
  priority: z.enum(['high', 'medium', 'low']),
  rings: z.enum(['always', 'allowed', 'morning', 'never']),
  state: z.enum(alarmStates),
  /** Whether the condition holds now, also where something hides the alarm. */
  holds: z.boolean(),
  /** What was found. */
  words: z.string(),
  rigId: idSchema.nullable(),
  rigName: z.string().nullable(),
  runId: idSchema.nullable(),
  /** Counts how often it was raised. */
  occurrence: z.number().int(),
  raisedAt: instantSchema.nullable(),
  acknowledged: actSchema.nullable(),
  confirmed: z.strictObject({ ...actSchema.shape, note: z.string() }).nullable(),
  shelf: z.strictObject({ by: z.string(), reason: z.string(), until: instantSchema, oneShot: z.boolean() }).nullable(),
  suppressedWhy: z.string().nullable(),
  outOfService: z.strictObject({ ...actSchema.shape, reason: z.string() }).nullable(),
  /** The alarm it follows from; null where it is a first cause. */
  causeId: idSchema.nullable(),
  shelveAtMostMin: z.number(),
});
export type AlarmView = z.infer<typeof alarmViewSchema>;

export const alarmHistorySchema = z.strictObject({
  seq: z.number().int(),
  alarmId: idSchema,
  title: z.string(),
  rigName: z.string().nullable(),
  at: instantSchema,
  fact: z.string(),
  by: z.string(),
  words: z.string(),
});
export type AlarmHistoryEntry = z.infer<typeof alarmHistorySchema>;

/** One alarm of the night, as a run's result shows it. */
export const runAlarmSchema = z.strictObject({
  alarmId: idSchema,
  occurrence: z.number().int(),
  code: z.string(),
  title: z.string(),
  cause: z.string(),
  consequence: z.string(),
  priority: z.enum(['high', 'medium', 'low']),
  rigName: z.string().nullable(),
  /** What was found. */
  words: z.string(),
  raisedAt: instantSchema,
  /** When it was over; null: it holds still, or was put aside before. */
  untilAt: instantSchema.nullable(),
  /** Names of those whom a message reached. */
  told: z.array(z.string()),
  seen: actSchema.nullable(),
  done: z.strictObject({ ...actSchema.shape, note: z.string() }).nullable(),
  /** Shelved, suppressed or taken out of service while it held; `by` is empty where nobody did it. */
  aside: z.strictObject({ ...actSchema.shape, why: z.string() }).nullable(),
});
export type RunAlarm = z.infer<typeof runAlarmSchema>;

export const alarmHopSchema = z.strictObject({
  seq: z.number().int(),
  at: instantSchema,
  occurrence: z.number().int(),
  name: z.string(),
  means: z.enum(['push', 'mail', 'none']),
  outcome: z.enum(['sent', 'failed', 'not-set-up']),
  detail: z.string(),
});
export type AlarmHopView = z.infer<typeof alarmHopSchema>;

const alarms = '/labs/:labId/alarms';
const path = `${alarms}/:alarmId` as const;

export const listAlarms = defineRoute({
  name: 'listAlarms',
  summary: 'Alarms that stand or are hidden, newest first',
  method: 'GET',
  path: alarms,
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(alarmViewSchema), serverAt: instantSchema }),
  problems: ['not-found'],
});
export const getAlarm = defineRoute({
  name: 'getAlarm',
  summary: 'One alarm with what happened to it and every message that went out for it',
  method: 'GET',
  path,
  access: 'read',
  status: 200,
  response: z.strictObject({ alarm: alarmViewSchema, history: z.array(alarmHistorySchema), hops: z.array(alarmHopSchema) }),
  problems: ['not-found'],
});

export const listRunAlarms = defineRoute({
  name: 'listRunAlarms',
  summary: 'Alarms that were raised for a run, and those of its rig and of the lab that stood while it went on, in order; the last 200',
  method: 'GET',
  path: '/labs/:labId/runs/:runId/alarms',
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(runAlarmSchema) }),
  problems: ['not-found'],
});

const onAlarm = { method: 'POST', status: 200, idempotent: true, response: alarmViewSchema } as const;
const refusals = ['not-found', 'not-possible-now', 'key-reused', 'still-running'] as const;

export const acknowledgeAlarm = defineRoute({
  ...onAlarm,
  name: 'acknowledgeAlarm',
  summary: 'You have seen the alarm and take care of it: nobody else is rung',
  path: `${path}/acknowledge`,
  access: 'alarm.acknowledge',
  problems: refusals,
});
export const confirmAlarm = defineRoute({
  ...onAlarm,
  name: 'confirmAlarm',
  summary: 'What the alarm asks for is done',
  path: `${path}/confirm`,
  access: 'alarm.acknowledge',
  body: z.strictObject({ note: z.string().trim().max(500).default('') }),
  problems: ['invalid-input', ...refusals],
});
export const resetAlarm = defineRoute({
  ...onAlarm,
  name: 'resetAlarm',
  summary: 'Clear the latch of an alarm whose condition is away',
  path: `${path}/reset`,
  access: 'alarm.shelve',
  problems: refusals,
});
export const shelveAlarm = defineRoute({
  ...onAlarm,
  name: 'shelveAlarm',
  summary: 'Put an alarm aside for a time, with a reason',
  path: `${path}/shelve`,
  access: 'alarm.shelve',
  body: z.strictObject({
    forMin: z.number().int().min(1).max(1440),
    reason: z.string().trim().min(3, 'say why').max(300),
    /** It comes back already when its condition has gone away. */
    oneShot: z.boolean().default(false),
  }),
  problems: ['invalid-input', ...refusals],
});
export const unshelveAlarm = defineRoute({
  ...onAlarm,
  name: 'unshelveAlarm',
  summary: 'Take an alarm back from the shelf',
  path: `${path}/unshelve`,
  access: 'alarm.shelve',
  problems: refusals,
});
export const takeAlarmOut = defineRoute({
  ...onAlarm,
  name: 'takeAlarmOut',
  summary: 'Take an alarm out of service until somebody returns it, with a reason',
  path: `${path}/take-out`,
  access: 'rig.edit',
  body: z.strictObject({ reason: z.string().trim().min(3, 'say why').max(300) }),
  problems: ['invalid-input', ...refusals],
});
export const returnAlarm = defineRoute({
  ...onAlarm,
  name: 'returnAlarm',
  summary: 'Return an alarm to service',
  path: `${path}/return`,
  access: 'rig.edit',
  problems: refusals,
});

export const listAlarmHistory = defineRoute({
  name: 'listAlarmHistory',
  summary: 'What happened to the alarms of the lab, newest first',
  method: 'GET',
  path: '/labs/:labId/alarm-history',
  access: 'read',
  status: 200,
  query: pageQuerySchema,
  response: pageOf(alarmHistorySchema),
  problems: ['invalid-input', 'not-found'],
});
export const countAlarms = defineRoute({
  name: 'countAlarms',
  summary: 'How often each alarm was raised in the last seven days',
  method: 'GET',
  path: '/labs/:labId/alarm-counts',
  access: 'read',
  status: 200,
  response: z.strictObject({
    days: z.number().int(),
    items: z.array(
      z.strictObject({ code: z.string(), title: z.string(), priority: z.enum(['high', 'medium', 'low']), count: z.number().int() }),
    ),
  }),
  problems: ['not-found'],
});

export const channelLimitViewSchema = z.strictObject({
  id: idSchema,
  channelId: idSchema,
  channelName: z.string(),
  unit: z.string(),
  limit: channelLimitSchema,
  changedAt: instantSchema,
  changedBy: z.string(),
});
export type ChannelLimitView = z.infer<typeof channelLimitViewSchema>;

const limits = '/labs/:labId/rigs/:rigId/channel-limits';
export const listChannelLimits = defineRoute({
  name: 'listChannelLimits',
  summary: 'Limits of the channels of a rig',
  method: 'GET',
  path: limits,
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(channelLimitViewSchema) }),
  problems: ['not-found'],
});
export const addChannelLimit = defineRoute({
  name: 'addChannelLimit',
  summary: 'Set a limit for a channel: level, slope or silence',
  method: 'POST',
  path: limits,
  access: 'rig.edit',
  status: 201,
  idempotent: true,
  body: z.strictObject({ channelId: idSchema, limit: channelLimitSchema }),
  response: channelLimitViewSchema,
  problems: ['invalid-input', 'not-found', 'key-reused', 'still-running'],
});
export const removeChannelLimit = defineRoute({
  name: 'removeChannelLimit',
  summary: 'Remove a limit of a channel; its alarm returns to normal',
  method: 'DELETE',
  path: `${limits}/:limitId`,
  access: 'rig.edit',
  status: 204,
  problems: ['not-found'],
});
