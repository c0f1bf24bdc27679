import * as z from 'zod';
import { roomHoursSchema, schedulePlanSchema } from '../schedule/plan';
import { idSchema, instantSchema } from './common';
import { defineRoute } from './route';

/** One start of a schedule, past or to come. */
export const calendarItemSchema = z.strictObject({
  scheduleId: idSchema,
  rigId: idSchema,
  rigName: z.string(),
  protocolName: z.string(),
  protocolRevision: z.number().int(),
  dueAt: instantSchema,
  /** Predicted end of a run that starts then. */
  endsAt: instantSchema,
  /** `blocked`: night window or blackout dates stand against it, it will be missed. */
  state: z.enum(['planned', 'blocked', 'paused', 'skipped', 'started', 'missed']),
  /** Why it is blocked or was missed, or who skipped it; empty otherwise. */
  why: z.string(),
  /** What the time of day means where the clocks change; null on all other days. */
  remark: z.string().nullable(),
  runId: idSchema.nullable(),
  /** When something was decided last that concerns this start: itself, its schedule or the hours of its room; null: nothing ever was. */
  changedAt: instantSchema.nullable(),
});
export type CalendarItem = z.infer<typeof calendarItemSchema>;

export const scheduleViewSchema = z.strictObject({
  id: idSchema,
  rigId: idSchema,
  rigName: z.string(),
  protocolId: idSchema,
  protocolName: z.string(),
  protocolRevision: z.number().int(),
  massSetLabel: z.string(),
  plan: schedulePlanSchema,
  notes: z.string(),
  state: z.enum(['active', 'paused', 'ended']),
  madeBy: z.string(),
  madeAt: instantSchema,
});
export type ScheduleView = z.infer<typeof scheduleViewSchema>;

const schedules = '/labs/:labId/schedules';
const path = `${schedules}/:scheduleId` as const;

export const listSchedules = defineRoute({
  name: 'listSchedules',
  summary: 'Schedules that have not ended',
  method: 'GET',
  path: schedules,
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(scheduleViewSchema) }),
  problems: ['not-found'],
});
export const makeSchedule = defineRoute({
  name: 'makeSchedule',
  summary: 'Start an issued revision at a time, or again and again; it never arms the rig',
  method: 'POST',
  path: schedules,
  access: 'run.start',
  status: 201,
  idempotent: true,
  body: z.strictObject({
    rigId: idSchema,
    protocolId: idSchema,
    revision: z.number().int().positive(),
    massSetId: idSchema,
    plan: schedulePlanSchema,
    notes: z.string().max(5000).default(''),
  }),
  response: scheduleViewSchema,
  problems: ['invalid-input', 'not-found', 'protocol-refused', 'not-yet', 'not-possible-now', 'key-reused', 'still-running'],
});
export const changeSchedule = defineRoute({
  name: 'changeSchedule',
  summary: 'Pause a schedule, continue it, or end it for good',
  method: 'PATCH',
  path,
  access: 'run.start',
  status: 200,
  body: z.strictObject({ state: z.enum(['active', 'paused', 'ended']) }),
  response: scheduleViewSchema,
  problems: ['invalid-input', 'not-found', 'not-possible-now'],
});
export const skipStart = defineRoute({
  name: 'skipStart',
  summary: 'Skip one start of a schedule, or take the skip back',
  method: 'PUT',
  path: `${path}/skips`,
  access: 'run.start',
  status: 200,
  body: z.strictObject({ dueAt: instantSchema, skipped: z.boolean() }),
  response: z.strictObject({ dueAt: instantSchema, skipped: z.boolean() }),
  problems: ['invalid-input', 'not-found', 'not-possible-now'],
});
export const readCalendar = defineRoute({
  name: 'readCalendar',
  summary: 'Starts of all schedules in a span of at most 70 days',
  method: 'GET',
  path: '/labs/:labId/calendar',
  access: 'read',
  status: 200,
  query: z.strictObject({ from: instantSchema, until: instantSchema }),
  response: z.strictObject({ items: z.array(calendarItemSchema) }),
  problems: ['invalid-input', 'not-found'],
});

const hours = '/labs/:labId/rigs/:rigId/hours';
export const readRoomHours = defineRoute({
  name: 'readRoomHours',
  summary: 'Night window and blackout dates of the room of a rig',
  method: 'GET',
  path: hours,
  access: 'read',
  status: 200,
  response: roomHoursSchema,
  problems: ['not-found'],
});
export const changeRoomHours = defineRoute({
  name: 'changeRoomHours',
  summary: 'Set night window and blackout dates of the room of a rig',
  method: 'PUT',
  path: hours,
  access: 'rig.edit',
  status: 200,
  body: roomHoursSchema,
  response: roomHoursSchema,
  problems: ['invalid-input', 'not-found'],
});

const feed = '/labs/:labId/calendar-feed';
export const readFeedState = defineRoute({
  name: 'readFeedState',
  summary: 'Whether you have a secret calendar address, and since when',
  method: 'GET',
  path: feed,
  access: 'read',
  status: 200,
  response: z.strictObject({ madeAt: instantSchema.nullable() }),
  problems: ['not-found'],
});
export const makeFeed = defineRoute({
  name: 'makeFeed',
  summary: 'Make a secret calendar address of your own; an earlier one ends',
  method: 'POST',
  path: feed,
  access: 'read',
  status: 201,
  response: z.strictObject({
    /** Shown once: only a hash of it is kept. */
    address: z.string(),
    madeAt: instantSchema,
  }),
  problems: ['not-found'],
});
export const endFeed = defineRoute({
  name: 'endFeed',
  summary: 'End your secret calendar address',
  method: 'DELETE',
  path: feed,
  access: 'read',
  status: 204,
  problems: ['not-found'],
});
export const calendarFeed = defineRoute({
  name: 'calendarFeed',
  summary: 'What is planned, as iCalendar (RFC 5545), for whoever knows the secret address',
  method: 'GET',
  path: '/calendars/:token',
  access: 'public',
  status: 200,
  produces: 'text/calendar',
  problems: ['not-found'],
});
