import type * as z from 'zod';
import type { ProblemCode } from './problem';
import type { Act } from './roles';

/**
 * One route of the API. From these come validation on the server, the typed client, the OpenAPI description and the
 * tests of the role matrix; a route that is not described here does not exist.
 */
export interface RouteContract {
  /** Verb and noun, for example `startRun`; the OpenAPI operationId. */
  readonly name: string;
  readonly summary: string;
  readonly method: 'GET' | 'POST' | 'PUT' | 'PATCH' | 'DELETE';
  /** Express style under `/api`, for example `/labs/:labId/runs/:runId`. */
  readonly path: string;
  /** `public`: nobody need be signed in; `device`: a device token; `signed-in`: any account; otherwise an act of the role matrix in `:labId`. */
  readonly access: 'public' | 'device' | 'signed-in' | Act;
  readonly query?: z.ZodType;
  readonly body?: z.ZodType;
  /** JSON body of the success reply; absent for 204, streams and files. */
  readonly response?: z.ZodType;
  readonly status: 200 | 201 | 202 | 204;
  /** Media type of a reply or request that is not JSON. */
  readonly produces?:
    | 'text/event-stream'
    | 'text/calendar'
    | 'text/csv'
    | 'application/x-ndjson'
    | 'application/zip'
    | 'application/pdf'
    | 'application/json'
    | 'image/*';
  readonly consumes?: 'text/csv' | 'application/x-ndjson' | 'image/*';
  /** While the database is away it is answered out of the memory of the server that drives the runs, as far as that goes. */
  readonly fromMemory?: true;
  /** A command: needs an `Idempotency-Key` header, a repeat returns the first answer. */
  readonly idempotent?: true;
  /** Replies carry an ETag; a changing request needs `If-Match`. */
  readonly etag?: 'reply' | 'required';
  readonly problems: readonly ProblemCode[];
}

export const defineRoute = <const R extends RouteContract>(route: R): R => route;

export type ResponseOf<R extends RouteContract> = R extends { response: z.ZodType } ? z.output<R['response']> : undefined;
export type BodyOf<R extends RouteContract> = R extends { body: z.ZodType } ? z.input<R['body']> : undefined;
export type QueryOf<R extends RouteContract> = R extends { query: z.ZodType } ? z.input<R['query']> : undefined;

type ParamNames<P extends string> = P extends `${string}:${infer Name}/${infer Rest}`
  ? Name | ParamNames<Rest>
  : P extends `${string}:${infer Name}`
    ? Name
    : never;
export type ParamsOf<R extends RouteContract> = { [K in ParamNames<R['path']>]: string };
