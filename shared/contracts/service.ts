import * as z from 'zod';
import { defineRoute } from './route';

export const getHealth = defineRoute({
  name: 'getHealth',
  summary: 'Whether the server and its database answer',
  method: 'GET',
  path: '/health',
  access: 'public',
  status: 200,
  response: z.strictObject({ ok: z.boolean(), version: z.string(), serverAt: z.iso.datetime(), demo: z.boolean() }),
  problems: [],
});
export const getOpenApi = defineRoute({
  name: 'getOpenApi',
  summary: 'This API as OpenAPI 3.1',
  method: 'GET',
  path: '/openapi.json',
  access: 'public',
  status: 200,
  produces: 'application/json',
  problems: [],
});
export const getProtocolSchema = defineRoute({
  name: 'getProtocolSchema',
  summary: 'JSON Schema of the protocol document',
  method: 'GET',
  path: '/schemas/protocol-1.json',
  access: 'public',
  status: 200,
  produces: 'application/json',
  problems: [],
});
