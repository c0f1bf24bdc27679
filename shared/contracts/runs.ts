import * as z from 'zod';
import { protocolDocumentSchema } from '../protocol/document';
import { rigDocumentSchema } from '../rig/document';
import { idSchema, instantSchema, pageOf, pageQuerySchema } from './common';
import { positionViewSchema } from './position';
import { defineRoute } from './route';
import { chainedEventSchema, finishingSchema, interventionSchema, stepRowViewSchema } from './run-rows';
import { reversalSoFarSchema, waitingSchema } from './waiting';

export type { StepRowView } from './run-rows';

export const runStates = ['rehearsing', 'starting', 'running', 'holding', 'held', 'stopping', 'finished', 'stopped', 'failed'] as const;
export const runStateSchema = z.enum(runStates);
export type RunState = z.infer<typeof runStateSchema>;

export const runSummarySchema = z.strictObject({
  id: idSchema,
  rigId: idSchema,
  rigName: z.string(),
  protocolId: idSchema.nullable(),
  protocolName: z.string(),
  protocolRevision: z.number().int(),
  state: runStateSchema,
  rehearsal: z.boolean(),
  operator: z.string(),
  createdAt: instantSchema,
  startedAt: instantSchema.nullable(),
  endedAt: instantSchema.nullable(),
  predictedEndAt: instantSchema.nullable(),
});
export type RunSummary = z.infer<typeof runSummarySchema>;

export const runViewSchema = runSummarySchema.extend({
  notes: z.string(),
  massSetLabel: z.string(),
  /** Why it is held, stopped or failed, and what would help; empty while all is well. */
  reason: z.string(),
  current: stepRowViewSchema.nullable(),
  /** When the current step ends by plan; null where it ends by an event. */
  deadlineAt: instantSchema.nullable(),
  dwellsDone: z.number().int(),
  dwellsPlanned: z.number().int(),
  holdAfterDwell: z.boolean(),
  finishing: finishingSchema.nullable(),
  /** Of the dwells done, those that count. */
  dwellsGood: z.number().int(),
  /** What the present step waits for; null where it ends by plan. */
  waiting: waitingSchema.nullable(),
  /** What the run has reached: near minus far so far, from the good dwells; null before there is a reversal. */
  reversal: reversalSoFarSchema.nullable(),
  /** How well the counted angle is proved; null where the engine has kept nothing of the run. */
  position: positionViewSchema.nullable(),
  intervention: interventionSchema.nullable(),
  mayResume: z.strictObject({ ok: z.boolean(), why: z.string() }),
  /** Whether the rest of the present step, whose row is `seq`, may be left out. */
  maySkip: z.strictObject({ ok: z.boolean(), why: z.string(), seq: z.number().int().nullable() }),
  /** Last sequence number of the event chain. */
  lastSeq: z.number().int(),
  /** Set where the server found the run and cannot carry it on: nothing moves, the rig stays blocked until somebody ends the run. `why` in sentences. */
  quarantine: z.strictObject({ cause: z.enum(['other-version', 'no-link', 'broken']), why: z.string() }).nullable(),
  rig: rigDocumentSchema,
  protocol: protocolDocumentSchema,
  simulated: z.strictObject({ trueG: z.number(), seed: z.number(), rateHz: z.number() }).nullable(),
  /** From which the order of shuffled repeats is drawn; absent where the protocol has none. */
  shuffleSeed: z.number().int().optional(),
});
export type RunView = z.infer<typeof runViewSchema>;

/** What of a run's view changes while it goes on: all but what was settled when it was started, rig and protocol above all. */
const runProgressSchema = runViewSchema.pick({
  state: true,
  startedAt: true,
  endedAt: true,
  predictedEndAt: true,
  reason: true,
  current: true,
  deadlineAt: true,
  dwellsDone: true,
  dwellsPlanned: true,
  holdAfterDwell: true,
  finishing: true,
  dwellsGood: true,
  waiting: true,
  reversal: true,
  position: true,
  intervention: true,
  mayResume: true,
  maySkip: true,
  lastSeq: true,
  quarantine: true,
});

/** Messages of the live stream of a run (server-sent events). `snapshot`, `progress` and `event` carry the chain's seq as id. */
export const liveMessageSchemas = {
  /** The whole view: first message of every stream. */
  snapshot: runViewSchema,
  /** After each change. */
  progress: runProgressSchema,
  event: chainedEventSchema,
  step: stepRowViewSchema,
  samples: z.strictObject({
    channelId: idSchema,
    channel: z.string(),
    unit: z.string(),
    utcMs: z.array(z.number()),
    value: z.array(z.number()),
  }),
  /** Once a second. */
  beat: z.strictObject({
    serverAt: instantSchema,
    /** How far the time that the run keeps to is ahead of `serverAt`, where the server's clock was set while the run went on. */
    runAheadMs: z.number().optional(),
    link: z.enum(['closed', 'opening', 'ready', 'lost', 'refused']),
    lastReplyAt: instantSchema.nullable(),
    angleDeg: z.number().nullable(),
    /** In a sentence, whose personal locks are on the rig; null while there are none. */
    lockedBy: z.string().nullable(),
    /** In a sentence, that nobody drives the rig at the moment; absent while somebody does. */
    notDriven: z.string().optional(),
  }),
} as const;
export type LiveMessages = { [K in keyof typeof liveMessageSchemas]: z.infer<(typeof liveMessageSchemas)[K]> };

const labRuns = '/labs/:labId/runs';
const path = `${labRuns}/:runId` as const;
const command = z.strictObject({ tappedAt: instantSchema.optional() });
/** Of what sets masses in motion. */
export const motionFields = {
  /** When the tap was made, by the phone's clock corrected to the server's: the act expires 5 s after it. */
  tappedAt: instantSchema,
  /** Of the review that was confirmed; counts once, for 30 s. */
  reviewToken: z.string().max(200),
};

export const listRuns = defineRoute({
  name: 'listRuns',
  summary: 'Runs and rehearsals, newest first',
  method: 'GET',
  path: labRuns,
  access: 'read',
  fromMemory: true,
  status: 200,
  query: pageQuerySchema.extend({ rigId: idSchema.optional(), active: z.enum(['true']).optional() }),
  response: pageOf(runSummarySchema),
  problems: ['invalid-input', 'not-found'],
});
export const startRun = defineRoute({
  name: 'startRun',
  summary: 'Start an issued revision on an armed rig',
  method: 'POST',
  path: labRuns,
  access: 'run.start',
  status: 201,
  idempotent: true,
  body: z.strictObject({
    rigId: idSchema,
    protocolId: idSchema,
    revision: z.number().int().positive(),
    massSetId: idSchema,
    notes: z.string().max(5000).default(''),
    ...motionFields,
  }),
  response: runSummarySchema,
  problems: [
    'invalid-input',
    'not-found',
    'rig-busy',
    'not-armed',
    'not-signed',
    'not-reviewed',
    'locked',
    'not-ready',
    'protocol-refused',
    'not-yet',
    'not-possible-now',
    'key-reused',
    'still-running',
  ],
});
export const rehearse = defineRoute({
  name: 'rehearse',
  summary: 'Run the draft or a revision on the simulated rig in fast time',
  method: 'POST',
  path: '/labs/:labId/rehearsals',
  access: 'protocol.write',
  status: 202,
  idempotent: true,
  body: z.strictObject({
    rigId: idSchema,
    protocolId: idSchema,
    revision: z.number().int().positive().optional(),
    seed: z.number().int().min(1).max(2_147_483_646).default(1),
  }),
  response: runSummarySchema,
  problems: ['invalid-input', 'not-found', 'protocol-refused', 'not-yet'],
});
export const getRun = defineRoute({
  name: 'getRun',
  summary: 'One run',
  method: 'GET',
  path,
  access: 'read',
  fromMemory: true,
  status: 200,
  response: runViewSchema,
  problems: ['not-found'],
});
/** The contract of an act on a run that goes on. */
export const intervention = <L extends string>(
  leaf: L,
  route: { name: string; summary: string; access: 'run.hold' | 'run.stop' | 'run.resume' | 'prompt.confirm' },
) =>
  defineRoute({
    ...route,
    method: 'POST',
    path: `${path}/${leaf}` as const,
    status: 202,
    idempotent: true,
    body: command,
    response: z.strictObject({ runId: idSchema, serverAt: instantSchema }),
    problems: ['invalid-input', 'not-found', 'not-possible-now', 'key-reused', 'still-running'],
  });
export const holdRun = intervention('hold', {
  name: 'holdRun',
  summary: 'Hold: decelerate, keep torque; the run can be resumed',
  access: 'run.hold',
});
export const holdAfterDwell = intervention('hold-after-dwell', {
  name: 'holdAfterDwell',
  summary: 'Hold when the present dwell has ended',
  access: 'run.hold',
});
export const finishEarly = intervention('finish-early', {
  name: 'finishEarly',
  summary: 'End the run on a whole pair: the pass under way is made whole, no other begins, and what follows the repeats is carried out',
  access: 'run.hold',
});
export const stopRun = intervention('stop', { name: 'stopRun', summary: 'Stop: decelerate and end the run', access: 'run.stop' });
export const liveRun = defineRoute({
  name: 'liveRun',
  summary: 'Live stream of a run; continues after Last-Event-ID',
  method: 'GET',
  path: `${path}/live`,
  access: 'read',
  fromMemory: true,
  status: 200,
  produces: 'text/event-stream',
  problems: ['not-found'],
});
export const listSteps = defineRoute({
  name: 'listSteps',
  summary: 'The step log',
  method: 'GET',
  path: `${path}/steps`,
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(stepRowViewSchema) }),
  problems: ['not-found'],
});
export const stepsCsv = defineRoute({
  name: 'stepsCsv',
  summary: 'The step log as CSV',
  method: 'GET',
  path: `${path}/steps.csv`,
  access: 'read',
  status: 200,
  produces: 'text/csv',
  problems: ['not-found'],
});
export const stepsJson = defineRoute({
  name: 'stepsJson',
  summary: 'The step log as a JSON file',
  method: 'GET',
  path: `${path}/steps.json`,
  access: 'read',
  status: 200,
  produces: 'application/json',
  problems: ['not-found'],
});
export const listEvents = defineRoute({
  name: 'listEvents',
  summary: 'The event chain',
  method: 'GET',
  path: `${path}/events`,
  access: 'read',
  status: 200,
  query: pageQuerySchema.extend({ kind: z.string().max(60).optional() }),
  response: pageOf(chainedEventSchema),
  problems: ['invalid-input', 'not-found'],
});
export const downloadArchive = defineRoute({
  name: 'downloadArchive',
  summary: 'The run archive (ZIP)',
  method: 'GET',
  path: `${path}/archive.zip`,
  access: 'read',
  status: 200,
  produces: 'application/zip',
  problems: ['not-found', 'not-possible-now'],
});
