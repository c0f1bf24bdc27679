import * as z from 'zod';
import { problemCodes, problemSchema } from '@/shared/contracts/problem';
import { acts, type Act } from '@/shared/contracts/roles';
import type { RouteContract } from '@/shared/contracts/route';
import { protocolDocumentSchema, stepSchema } from '@/shared/protocol/document';
import { rigDocumentSchema } from '@/shared/rig/document';

type Json = Record<string, unknown>;

/** Schemas that many routes share, by the names they get. */
const named = z.registry<{ id: string }>();
named.add(protocolDocumentSchema, { id: 'ProtocolDocument' });
named.add(stepSchema, { id: 'Step' });
named.add(rigDocumentSchema, { id: 'RigDocument' });
named.add(rigDocumentSchema.shape.sources, { id: 'Sources' });

/** Schemas named once and referred to from everywhere. */
class Components {
  readonly schemas: Record<string, Json> = {};

  /** The JSON Schema of a zod schema; parts that refer to themselves move to the components under `name`. */
  add(name: string, of: z.ZodType, io: 'input' | 'output'): Json {
    const { $defs, ...whole } = z.toJSONSchema(of, { target: 'draft-2020-12', io, unrepresentable: 'any', metadata: named }) as Json;
    const nameOf = (part: string) => (part.startsWith('__') ? `${name}.${part}` : part);
    const rename = (value: unknown): unknown => {
      if (Array.isArray(value)) return value.map(rename);
      if (typeof value !== 'object' || value === null) return value;
      return Object.fromEntries(
        Object.entries(value).map(([key, inner]) => [
          key,
          key === '$ref' && typeof inner === 'string' ? `#/components/schemas/${nameOf(inner.replace('#/$defs/', ''))}` : rename(inner),
        ]),
      );
    };
    for (const [part, definition] of Object.entries(($defs ?? {}) as Record<string, Json>)) {
      delete definition.id;
      this.schemas[nameOf(part)] = rename(definition) as Json;
    }
    delete whole.$schema;
    return rename(whole) as Json;
  }
}

const pathOf = (contract: RouteContract) => `/api${contract.path.replaceAll(/:(\w+)/g, '{$1}')}`;

/** The API as OpenAPI 3.1, whose schemas are JSON Schema 2020-12, made from the contracts and nothing else. */
export function openApiOf(contracts: readonly RouteContract[], version: string): Json {
  const components = new Components();
  components.schemas.Problem = components.add('Problem', problemSchema, 'output');
  const paths: Record<string, Json> = {};
  for (const contract of contracts) {
    const path = pathOf(contract);
    paths[path] = { ...paths[path], [contract.method.toLowerCase()]: operationOf(contract, components) };
  }
  return {
    openapi: '3.1.0',
    info: {
      title: 'Evenfall',
      version,
      summary: 'Plan, run and prove a measurement of gravity with a torsion balance.',
      license: { name: 'MIT', identifier: 'MIT' },
    },
    jsonSchemaDialect: 'https://json-schema.org/draft/2020-12/schema',
    servers: [{ url: '/' }],
    paths,
    components: {
      schemas: components.schemas,
      securitySchemes: {
        session: { type: 'apiKey', in: 'cookie', name: 'ef', description: '`__Host-ef` where the server is reached over TLS.' },
        device: { type: 'http', scheme: 'bearer', description: 'A device token, made on the page of the rig.' },
      },
    },
  };
}

function operationOf(contract: RouteContract, components: Components): Json {
  const isAct = contract.access in acts;
  const body = requestBodyOf(contract, components);
  return {
    operationId: contract.name,
    summary: contract.summary,
    security: contract.access === 'public' ? [] : [contract.access === 'device' ? { device: [] } : { session: [] }],
    ...(isAct ? { 'x-act': contract.access, 'x-roles': acts[contract.access as Act] } : {}),
    parameters: parametersOf(contract, components),
    ...(body === null ? {} : { requestBody: body }),
    responses: responsesOf(contract, components),
  };
}

function parametersOf(contract: RouteContract, components: Components): Json[] {
  const inPath = [...contract.path.matchAll(/:(\w+)/g)].map(([, name]) => ({
    name,
    in: 'path',
    required: true,
    schema: { type: 'string' },
  }));
  const query = contract.query === undefined ? {} : components.add(`${contract.name}.query`, contract.query, 'input');
  const required = new Set((query.required ?? []) as string[]);
  const inQuery = Object.entries((query.properties ?? {}) as Json).map(([name, schema]) => ({
    name,
    in: 'query',
    required: required.has(name),
    schema,
  }));
  const headers = [
    ...(contract.idempotent === true
      ? [
          {
            name: 'Idempotency-Key',
            in: 'header',
            required: true,
            description: 'New for each command, the same for each repeat of it.',
            schema: { type: 'string', minLength: 1, maxLength: 128 },
          },
        ]
      : []),
    ...(contract.etag === 'required'
      ? [{ name: 'If-Match', in: 'header', required: true, description: 'ETag of the version edited.', schema: { type: 'string' } }]
      : []),
    ...(contract.produces === 'text/event-stream'
      ? [
          {
            name: 'Last-Event-ID',
            in: 'header',
            required: false,
            description: 'The stream continues after this event.',
            schema: { type: 'string' },
          },
        ]
      : []),
  ];
  return [...inPath, ...inQuery, ...headers];
}

function requestBodyOf(contract: RouteContract, components: Components): Json | null {
  if (contract.consumes !== undefined)
    return { required: true, content: { [contract.consumes]: { schema: { type: 'string', format: 'binary' } } } };
  if (contract.body === undefined) return null;
  const schema = components.add(`${contract.name}.body`, contract.body, 'input');
  return { required: Array.isArray(schema.required) && schema.required.length > 0, content: { 'application/json': { schema } } };
}

function responsesOf(contract: RouteContract, components: Components): Json {
  const media = contract.produces ?? 'application/json';
  const schema =
    contract.response === undefined
      ? media === 'application/json'
        ? {}
        : { type: 'string' }
      : components.add(`${contract.name}.response`, contract.response, 'output');
  const success = contract.status === 204 ? { description: 'Done' } : { description: contract.summary, content: { [media]: { schema } } };
  const responses: Json = { [contract.status]: success };
  for (const code of everyProblemOf(contract)) {
    const status = String(problemCodes[code]);
    const before = responses[status] as { description: string } | undefined;
    responses[status] = {
      description: before === undefined ? code : `${before.description}, ${code}`,
      content: { 'application/problem+json': { schema: { $ref: '#/components/schemas/Problem' } } },
    };
  }
  return responses;
}

/** Problems of the route itself and those the edge may answer on it. */
function everyProblemOf(contract: RouteContract): Set<keyof typeof problemCodes> {
  const edge: (keyof typeof problemCodes)[] = ['too-many-requests', 'internal', 'database-away'];
  if (/\/(rigs|runs|doors|serial-ports)\b/.test(contract.path)) edge.push('rigs-away');
  if (contract.access === 'signed-in' || contract.access in acts) edge.push('not-signed-in', 'session-expired');
  if (contract.access in acts) edge.push('not-allowed', 'not-found');
  if (contract.method !== 'GET' && contract.access !== 'device') edge.push('cross-site');
  if (contract.body !== undefined) edge.push('invalid-input', 'too-large', 'wrong-content-type');
  if (contract.idempotent === true) edge.push('key-reused', 'still-running');
  if (contract.etag === 'required') edge.push('precondition-required');
  return new Set([...contract.problems, ...edge]);
}
