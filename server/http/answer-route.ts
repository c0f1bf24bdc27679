import express, { type Request, type RequestHandler, type Response } from 'express';
import type { RouteContract } from '@/shared/contracts/route';
import { may, roles, type Act } from '@/shared/contracts/roles';
import type { IdempotencyAnswer, IdempotencyPort } from '../interfaces/idempotency';
import { checkedResponse } from './check-response';
import { parsedBy } from './desk/here-desk';
import { isDatabaseAway } from '../store/failures';
import { actOnce, fingerprintOf, idempotencyKeyOf, rethrowKeptProblem } from './idempotent';
import { linkToNext } from './paging';
import { notFound, ProblemError } from './problem-error';
import type { AtTheRig, Membership, MountedRoute, RouteContext, SignedIn } from './route-context';
import type { Services } from './services';
import { clearSessionCookie, readSessionToken, setSessionCookie } from './session-cookie';

/** Hold, stop and one's own personal lock: no database may stand between a member and these. */
export const isIntervention = ({ access, name }: RouteContract) => access === 'run.hold' || access === 'run.stop' || name === 'setLock';

export interface RouteParts {
  services: Services;
  readJson: RequestHandler;
  /** Keys of hold, stop and personal locks. */
  interventionKeys: IdempotencyPort;
}

/** The life of a request after the edge: who, what, once, answer. */
export function answerRoute(route: MountedRoute, parts: RouteParts): RequestHandler {
  const { contract } = route;
  return async (req, res) => {
    const caller = await identify(contract, req, parts.services);
    const query = parsedBy(contract, 'query', req.query);
    const body = await readBody(contract, { req, res, readJson: parts.readJson });
    const ifMatch = readIfMatch(contract, req);
    const key = contract.idempotent === true ? idempotencyKeyOf(req.get('idempotency-key')) : null;
    const reply: { etag: string | null } = { etag: null };
    const context = {
      ...caller,
      ...sessionCookies(res, parts.services),
      params: req.params,
      query,
      body,
      ifMatch,
      key,
      services: parts.services,
      req,
      res,
      setEtag: (version: string) => {
        reply.etag = version;
      },
    } as unknown as RouteContext;
    const act = async (): Promise<IdempotencyAnswer> => {
      if (route.atTheRig !== undefined) return askAtTheRig(route, route.atTheRig, context);
      const value = await route.handle(context);
      return {
        status: contract.status,
        body: contract.response === undefined ? null : checkedResponse(contract.response, value, parts.services),
        etag: reply.etag,
      };
    };
    if (contract.produces !== undefined) {
      await route.handle(context);
      return;
    }
    const answer = key === null ? await act() : await once(contract, { context, req, key, parts }, act);
    rethrowKeptProblem(answer);
    send(res, req, answer);
  };
}

function askAtTheRig(
  { contract }: MountedRoute,
  { which, urgent, elseStored }: AtTheRig,
  context: RouteContext,
): Promise<IdempotencyAnswer> {
  const { req, services, ifMatch, key } = context;
  const [me, membership] = [context.me as SignedIn | null, context.membership as Membership | null];
  const question = {
    route: contract.name,
    params: context.params as Record<string, string>,
    query: req.query,
    body: (req.body ?? {}) as unknown,
    ifMatch,
    key,
    me: me === null ? null : { userId: me.userId, name: me.name, email: me.email },
    membership,
  };
  if (which === 'each') return services.desk.askEach(question, membership?.labId ?? '');
  return services.desk.ask({ question, which: () => which(context), urgent, elseStored });
}

function once(
  contract: RouteContract,
  from: { context: RouteContext; req: Request; key: string; parts: RouteParts },
  act: () => Promise<IdempotencyAnswer>,
): Promise<IdempotencyAnswer> {
  const { context, req, key, parts } = from;
  const fingerprint = fingerprintOf(
    { method: req.method, path: req.path, ifMatch: context.ifMatch, body: context.body },
    parts.services.sha256,
  );
  const port = isIntervention(contract) ? parts.interventionKeys : parts.services.idempotency;
  const me = context.me as SignedIn | null;
  return actOnce(port, { userId: me?.userId ?? '', key, fingerprint }, act);
}

function send(res: Response, req: Request, answer: IdempotencyAnswer): void {
  if (answer.etag !== null) res.set('ETag', `"${answer.etag}"`);
  const link = linkToNext(req, answer.body);
  if (link !== null) res.set('Link', link);
  if (answer.body === null) res.status(answer.status).end();
  else res.status(answer.status).json(answer.body);
}

async function identify(
  contract: RouteContract,
  req: Request,
  services: Services,
): Promise<{ me: SignedIn | null; membership: Membership | null }> {
  if (contract.access === 'public' || contract.access === 'device') return { me: null, membership: null };
  const token = readSessionToken(req, services.config);
  if (token === null) throw new ProblemError('not-signed-in', 'Sign in first; the request carries no session.');
  const labId = typeof req.params.labId === 'string' ? req.params.labId : '';
  const known = { contract, token, labId, services };
  const away = contract.fromMemory === true && services.databaseAwaySinceUtcMs() !== null;
  const remembered = isIntervention(contract) || away ? rememberedFor(known) : null;
  try {
    return await identified(known, remembered);
  } catch (error) {
    // The keeper of the leases may not have noticed yet.
    const again = contract.fromMemory === true && isDatabaseAway(error) ? rememberedFor(known) : null;
    if (again === null) throw error;
    return identified(known, again);
  }
}

interface Asked {
  contract: RouteContract;
  token: string;
  labId: string;
  services: Services;
}

type Remembered = { me: SignedIn; membership: Membership | null };

function rememberedFor({ contract, token, labId, services }: Asked): Remembered | null {
  if (contract.access !== 'signed-in') return services.access.remembered(token, labId);
  const me = services.access.rememberedSelf(token);
  return me === null ? null : { me, membership: null };
}

async function identified({ contract, token, labId, services }: Asked, remembered: Remembered | null): Promise<Remembered> {
  const me = remembered?.me ?? (await services.access.signedIn(token));
  if (me === null)
    throw new ProblemError('session-expired', 'The session has ended. Sign in again; what you typed is still on the screen.');
  if (contract.access === 'public' || contract.access === 'device' || contract.access === 'signed-in') return { me, membership: null };
  const membership = remembered?.membership ?? (await services.access.membership(me.userId, labId));
  if (membership === null) throw notFound('lab');
  assertMay(membership, contract.access, services);
  return { me, membership };
}

function assertMay(membership: Membership, act: Act, services: Services): void {
  if (may(membership.role, act)) return;
  services.log.warn({ labId: membership.labId, role: membership.role, act }, 'refused by role');
  const who = roles.filter((role) => may(role, act));
  throw new ProblemError('not-allowed', `Your role in ${membership.labName} is ${membership.role}; this needs ${who.join(' or ')}.`);
}

const hasBody = (req: Request) => req.headers['transfer-encoding'] !== undefined || Number(req.headers['content-length'] ?? 0) > 0;

async function readBody(
  contract: RouteContract,
  { req, res, readJson }: { req: Request; res: Response; readJson: RequestHandler },
): Promise<unknown> {
  if (contract.consumes !== undefined) {
    if (req.get('content-encoding') !== undefined)
      throw new ProblemError('wrong-content-type', 'This route takes the file as it is, without a content encoding.');
    if (req.is(contract.consumes) === false)
      throw new ProblemError(
        'wrong-content-type',
        `This route takes ${contract.consumes}; the request said ${req.get('content-type') ?? 'nothing'}.`,
      );
    return undefined;
  }
  if (contract.body === undefined) return undefined;
  if (!hasBody(req)) return parsedBy(contract, 'body', {});
  if (req.is('application/json') === false)
    throw new ProblemError(
      'wrong-content-type',
      `This route takes application/json; the request said ${req.get('content-type') ?? 'nothing'}.`,
    );
  await new Promise<void>((resolve, reject) => {
    void readJson(req, res, (error?: unknown) => {
      if (error === undefined) resolve();
      else reject(error as Error);
    });
  });
  return parsedBy(contract, 'body', req.body ?? {});
}

function readIfMatch(contract: RouteContract, req: Request): string | null {
  const version = req.get('if-match')?.replace(/^(?:W\/)?"(.*)"$/, '$1') ?? null;
  if (contract.etag === 'required' && (version === null || version === ''))
    throw new ProblemError('precondition-required', 'Name the version you edited: send its ETag in the header If-Match.');
  return version;
}

function sessionCookies(res: Response, services: Services) {
  return {
    setSession: (token: string, expiresAt: Date) => setSessionCookie(res, services.config, { token, expiresAt }),
    clearSession: () => clearSessionCookie(res, services.config),
  };
}

/** Reader of JSON bodies up to `limitBytes`; scalars are JSON too and get the schema's own refusal. */
export const jsonReader = (limitBytes: number): RequestHandler =>
  express.json({ limit: limitBytes, strict: false, type: 'application/json' });
