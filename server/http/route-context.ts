import type { Request, Response } from 'express';
import type * as z from 'zod';
import type { Role } from '@/shared/contracts/roles';
import type { ParamsOf, ResponseOf, RouteContract } from '@/shared/contracts/route';
import type { Session } from '../interfaces/sessions';
import type { WhichRig } from './desk/rig-desk';
import type { Services } from './services';

/** Who is signed in. */
export interface SignedIn {
  userId: string;
  name: string;
  email: string;
  session: Session;
  /** The cookie's token: needed to end this very session, never logged and never stored. */
  token: string;
}

/** The lab of the route's `:labId` and what the caller is in it. */
export interface Membership {
  labId: string;
  labName: string;
  timeZone: string;
  role: Role;
}

type ParsedOf<R extends RouteContract, K extends 'query' | 'body'> =
  R extends Record<K, infer S extends z.ZodType> ? z.output<S> : undefined;

export interface RouteContext<R extends RouteContract = RouteContract> {
  params: ParamsOf<R>;
  query: ParsedOf<R, 'query'>;
  body: ParsedOf<R, 'body'>;
  me: R['access'] extends 'public' | 'device' ? SignedIn | null : SignedIn;
  membership: R['access'] extends 'public' | 'device' | 'signed-in' ? null : Membership;
  services: Services;
  /** The version named by `If-Match`, without quotes; never empty where the contract says `etag: 'required'`. */
  ifMatch: string | null;
  /** Its `Idempotency-Key`; null where the contract asks for none. */
  key: string | null;
  /** Names the version of the answer; sent as ETag. */
  setEtag(version: string): void;
  /** Sets the session cookie. */
  setSession(token: string, expiresAt: Date): void;
  clearSession(): void;
  req: Request;
  /** For streams and files only; JSON answers are returned. */
  res: Response;
}

export type RouteHandler<R extends RouteContract> = (context: RouteContext<R>) => Promise<ResponseOf<R>> | ResponseOf<R>;

/** A route that only the process can answer that drives the rig. */
export interface AtTheRig {
  /** `each`: a list of rigs, to which every process has its part. */
  which: ((context: RouteContext) => Promise<WhichRig>) | 'each';
  urgent: boolean;
  elseStored: boolean;
}

export interface MountedRoute {
  readonly contract: RouteContract;
  readonly handle: (context: RouteContext) => Promise<unknown>;
  readonly atTheRig?: AtTheRig;
}

/** Joins a contract and the function that answers it; `createApp` puts the pairs under `/api`. */
export function mount<const R extends RouteContract>(contract: R, handler: RouteHandler<R>): MountedRoute {
  return { contract, handle: async (context) => handler(context as unknown as RouteContext<R>) };
}
