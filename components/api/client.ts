import { problemSchema } from '@/shared/contracts/problem';
import type { BodyOf, ParamsOf, QueryOf, ResponseOf, RouteContract } from '@/shared/contracts/route';
import { reportReached } from './connection';
import { deviceNowMs, observeServerTime } from './device-clock';
import { ApiProblem, ApiUnreachable } from './problem';

export interface CallInput<R extends RouteContract> {
  params?: ParamsOf<R>;
  query?: QueryOf<R>;
  body?: BodyOf<R>;
  /** A file or text sent as it is, for routes that consume another type than JSON. */
  raw?: Blob | string;
  /** The ETag an edit is based on. */
  ifMatch?: string | undefined;
  /** The same key for every attempt at the same act; made here when absent. */
  idempotencyKey?: string | undefined;
  signal?: AbortSignal | undefined;
  /** The token of a device, for routes that devices call. */
  deviceToken?: string;
  /** Lets the request outlive the page: for hold and stop. */
  keepalive?: boolean;
}

export interface CallResult<R extends RouteContract> {
  data: ResponseOf<R>;
  etag: string | null;
}

/** 128 random bits. `crypto.randomUUID` exists on https only, and a lab's server may be plain http in its own network. */
export function newIdempotencyKey(): string {
  return Array.from(crypto.getRandomValues(new Uint8Array(16)), (byte) => byte.toString(16).padStart(2, '0')).join('');
}

/** The address of a route under `/api` with its parameters and query filled in. */
export function addressOf(route: RouteContract, input: { params?: Record<string, string>; query?: unknown }): string {
  const path = route.path.replace(/:(\w+)/g, (_, name: string) => {
    const value = input.params?.[name];
    if (value === undefined) throw new Error(`route ${route.name} needs the parameter ${name}`);
    return encodeURIComponent(value);
  });
  const pairs = Object.entries((input.query ?? {}) as Record<string, unknown>).filter(([, value]) => value !== undefined);
  const query = new URLSearchParams(pairs.map(([name, value]) => [name, String(value)])).toString();
  return `/api${path}${query === '' ? '' : `?${query}`}`;
}

/** Of a kind of which there are several, a picture for instance, the body says which it is. */
const typeOf = (raw: Blob | string, consumes = 'application/octet-stream') =>
  consumes.endsWith('/*') && raw instanceof Blob ? raw.type : consumes;

function headersOf<R extends RouteContract>(route: R, input: CallInput<R>): Headers {
  const headers = new Headers({ accept: route.produces ?? 'application/json, application/problem+json' });
  if (input.raw !== undefined) headers.set('content-type', typeOf(input.raw, route.consumes));
  else if (input.body !== undefined) headers.set('content-type', 'application/json');
  if (input.deviceToken !== undefined) headers.set('authorization', `Bearer ${input.deviceToken}`);
  if (input.ifMatch !== undefined) headers.set('if-match', input.ifMatch);
  if (route.idempotent === true) headers.set('idempotency-key', input.idempotencyKey ?? newIdempotencyKey());
  return headers;
}

async function problemOf(response: Response): Promise<ApiProblem> {
  const parsed = problemSchema.safeParse(await response.json().catch(() => undefined));
  if (parsed.success) return new ApiProblem(parsed.data);
  return new ApiProblem({
    type: '/problems/internal',
    title: 'Unexpected answer',
    status: response.status,
    code: 'internal',
    detail: `The server answered ${response.status} without saying why. Try again in a moment.`,
  });
}

const notUnderstood = (status: number) =>
  new ApiProblem({
    type: '/problems/internal',
    title: 'Unexpected answer',
    status,
    code: 'internal',
    detail:
      'The answer was not understood. Reload the page: the server may be newer than it. If a page of the network came in place of the server, sign in to the network first.',
  });

type RefusedListener = () => void;
const refusedListeners = new Set<RefusedListener>();

/** Tells when an answer says that nobody is signed in any more; wrong credentials do not count. */
export function onSignInRefused(listener: RefusedListener): () => void {
  refusedListeners.add(listener);
  return () => refusedListeners.delete(listener);
}

async function send(address: string, init: RequestInit): Promise<Response> {
  try {
    const response = await fetch(address, init);
    reportReached(true);
    return response;
  } catch (error) {
    if (init.signal?.aborted === true) throw error;
    reportReached(false);
    throw new ApiUnreachable();
  }
}

function learnTime(data: unknown, sentMs: number): void {
  if (typeof data !== 'object' || data === null || !('serverAt' in data) || typeof data.serverAt !== 'string') return;
  observeServerTime({ sentMs, receivedMs: deviceNowMs(), serverMs: Date.parse(data.serverAt) });
}

/**
 * Calls a route of the API by its contract.
 * @throws {ApiProblem} the server refused; @throws {ApiUnreachable} it did not answer. Nothing is sent twice from here.
 */
export async function call<R extends RouteContract>(route: R, input: CallInput<R> = {}): Promise<CallResult<R>> {
  const sentMs = deviceNowMs();
  const response = await send(addressOf(route, input), {
    method: route.method,
    credentials: 'same-origin',
    headers: headersOf(route, input),
    body: input.raw ?? (input.body === undefined ? null : JSON.stringify(input.body)),
    signal: input.signal ?? null,
    keepalive: input.keepalive ?? false,
  });
  if (!response.ok) {
    const problem = await problemOf(response);
    if (problem.code === 'not-signed-in' || problem.code === 'session-expired') for (const listener of refusedListeners) listener();
    throw problem;
  }
  const etag = response.headers.get('etag');
  if (route.response === undefined) {
    // The sign-in page of a network answers everything with 200: without a body to read, only the status tells.
    if (response.status !== route.status) throw notUnderstood(response.status);
    return { data: undefined as ResponseOf<R>, etag };
  }
  const body: unknown = await response.json().catch(() => undefined);
  learnTime(body, sentMs);
  const parsed = route.response.safeParse(body);
  if (!parsed.success) throw notUnderstood(response.status);
  return { data: parsed.data as ResponseOf<R>, etag };
}
