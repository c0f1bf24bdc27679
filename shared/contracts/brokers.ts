import * as z from 'zod';
import { filterProblem } from '../lib/topic-filter';
import { idSchema, instantSchema } from './common';
import { streamChannelSchema } from './devices';
import { defineRoute } from './route';

/** MQTT 3.1.1 brokers whose messages fill channels of a rig. */

const pathSchema = z
  .string()
  .trim()
  .max(200)
  .regex(/^[^.[\]]+(\[\d{1,4}\])*(\.[^.[\]]+(\[\d{1,4}\])*)*$/, 'names with dots between them, as in sensor.value or values[0].v');

/** What is read out of the messages of a topic. */
export const brokerTopicSchema = z.strictObject({
  /** With + for one level and # for all that follow. */
  filter: z
    .string()
    .trim()
    .max(400)
    .superRefine((filter, context) => {
      const problem = filterProblem(filter);
      if (problem !== null) context.addIssue({ code: 'custom', message: problem });
    }),
  channel: streamChannelSchema,
  /** Where the number is in a JSON message; null: the message is the number. */
  valuePath: pathSchema.nullable(),
  /** When it was measured; null: it is stamped as it arrives. */
  time: z.strictObject({ path: pathSchema, form: z.enum(['iso', 's', 'ms', 'us']) }).nullable(),
  /** Standard uncertainty of the stamp, s. */
  timeUS: z.number().positive().max(3600),
});
export type BrokerTopic = z.infer<typeof brokerTopicSchema>;

const topicStatusSchema = z.strictObject({
  /** Messages since the server that listens began. */
  taken: z.number().int(),
  refused: z.number().int(),
  last: z.strictObject({ at: instantSchema, topic: z.string(), payload: z.string() }).nullable(),
  lastRefused: z.strictObject({ at: instantSchema, topic: z.string(), reason: z.string() }).nullable(),
});
export const brokerStatusSchema = z.strictObject({
  state: z.enum(['connecting', 'connected', 'away']),
  since: instantSchema,
  /** Why it is away. */
  reason: z.string().nullable(),
  toldAt: instantSchema,
  /** In the order of the topics. */
  topics: z.array(topicStatusSchema),
});
export type BrokerStatus = z.infer<typeof brokerStatusSchema>;

export const brokerViewSchema = z.strictObject({
  id: idSchema,
  address: z.string(),
  /** Whether it is given a name and a password; neither is ever told. */
  signsIn: z.boolean(),
  /** Certificate by which its own is proved, PEM; null: those that the system trusts. */
  ca: z.string().nullable(),
  topics: z.array(brokerTopicSchema),
  madeAt: instantSchema,
  madeBy: z.string(),
  /** Null before a server began to listen. */
  status: brokerStatusSchema.nullable(),
});
export type BrokerView = z.infer<typeof brokerViewSchema>;

const path = '/labs/:labId/rigs/:rigId/brokers';

const settingShape = {
  address: z
    .string()
    .trim()
    .max(300)
    .regex(/^mqtts?:\/\/([\w.-]+|\[[0-9a-fA-F:.]+\])(:\d{1,5})?\/?$/, 'mqtt://host:1883, or mqtts://host:8883 with TLS'),
  ca: z.string().trim().min(1).max(20_000).nullish(),
  topics: z.array(brokerTopicSchema).min(1).max(8),
};
const signInShape = {
  userName: z.string().trim().min(1).max(200).nullable(),
  password: z.string().min(1).max(1000).nullable(),
};

export const listBrokers = defineRoute({
  name: 'listBrokers',
  summary: 'MQTT brokers that fill channels of a rig, with what was heard of them',
  method: 'GET',
  path,
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(brokerViewSchema) }),
  problems: ['not-found'],
});
export const addBroker = defineRoute({
  name: 'addBroker',
  summary: 'Listen to an MQTT 3.1.1 broker; the channels that its topics fill are made where they are missing',
  method: 'POST',
  path,
  access: 'tokens.manage',
  status: 201,
  body: z.strictObject({ ...settingShape, ...signInShape }),
  response: brokerViewSchema,
  problems: ['invalid-input', 'not-found', 'already-exists'],
});
export const reviseBroker = defineRoute({
  name: 'reviseBroker',
  summary: 'Listen to a broker in another way: what it sent so far stays as it is',
  method: 'PUT',
  path: `${path}/:brokerId`,
  access: 'tokens.manage',
  status: 200,
  /** Name and password are given anew where the address is another one. */
  body: z.strictObject({ ...settingShape, signIn: z.union([z.literal('as-before'), z.strictObject(signInShape)]) }),
  response: brokerViewSchema,
  problems: ['invalid-input', 'not-found', 'already-exists'],
});
export const removeBroker = defineRoute({
  name: 'removeBroker',
  summary: 'Listen no more to a broker; its name and password are forgotten, what it sent stays',
  method: 'DELETE',
  path: `${path}/:brokerId`,
  access: 'tokens.manage',
  status: 204,
  problems: ['not-found'],
});
