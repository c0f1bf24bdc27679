import compression from 'compression';
import express, { Router, type ErrorRequestHandler, type Express, type RequestHandler } from 'express';
import { problemCodes } from '@/shared/contracts/problem';
import { answerRoute, isIntervention, jsonReader } from './answer-route';
import { problemErrorOf } from './errors';
import { MemoryIdempotency } from './idempotent';
import { ProblemError, problemOf } from './problem-error';
import { problemPages } from './problem-pages';
import { limitRate } from './rate-limits';
import { healthz, readyz } from './readiness';
import { logRequests, requestIdOf } from './request-log';
import type { MountedRoute } from './route-context';
import { assertSameOrigin } from './same-origin';
import { securityHeaders } from './security-headers';
import type { Services } from './services';
import { readSessionToken } from './session-cookie';
import { readWebPages, webFiles } from './web-files';

/** The Express application: edge, routes of the contracts, web files, problems. */
export function createApp(services: Services, routes: readonly MountedRoute[]): Express {
  const { config } = services;
  const app = express();
  const pages = readWebPages(config.webDir);
  app.disable('x-powered-by');
  app.set('trust proxy', config.trustedProxies);
  app.set('query parser', 'simple');
  app.use(logRequests(services), securityHeaders(config, Object.values(pages)), compression({ filter: mayCompress }));
  app.get('/healthz', healthz);
  app.get('/readyz', limitRate(services.config.limits.requestsPerMinute), readyz(services));
  app.use('/api', apiRouter(services, routes));
  app.use('/problems', problemPages());
  app.use(webFiles(config.webDir, { pages, hasSession: (req) => readSessionToken(req, config) !== null }));
  app.use(answerProblems(services));
  return app;
}

/** A compressed event stream would be held back until a block is full. */
const mayCompress: typeof compression.filter = (req, res) =>
  !String(res.getHeader('Content-Type')).startsWith('text/event-stream') && compression.filter(req, res);

function apiRouter(services: Services, routes: readonly MountedRoute[]): Router {
  const { limits } = services.config;
  const router = Router({ caseSensitive: true });
  const ordinary = limitRate(limits.requestsPerMinute);
  const interventions = limitRate(limits.interventionsPerMinute);
  const parts = { services, readJson: jsonReader(limits.jsonBytes), interventionKeys: new MemoryIdempotency() };
  router.use(noStore, (req, _res, next) => {
    assertSameOrigin(req, services.config);
    next();
  });
  for (const route of routes) {
    const register = route.contract.method.toLowerCase() as 'get' | 'post' | 'put' | 'patch' | 'delete';
    router[register](route.contract.path, isIntervention(route.contract) ? interventions : ordinary, answerRoute(route, parts));
  }
  router.use(ordinary, () => {
    throw new ProblemError('not-found', 'There is no such route; /api/openapi.json lists them all.');
  });
  return router;
}

const noStore: RequestHandler = (_req, res, next) => {
  res.set('Cache-Control', 'no-store');
  next();
};

function answerProblems(services: Services): ErrorRequestHandler {
  const answer = (...[error, req, res]: Parameters<ErrorRequestHandler>): void => {
    const problem = problemErrorOf(error, services.databaseAwaySinceUtcMs(), services.config.roles.includes('rig'));
    if (problemCodes[problem.code] >= 500) services.log.error({ err: error as Error, requestId: requestIdOf(res) }, 'a request failed');
    if (res.headersSent) {
      res.destroy();
      return;
    }
    res.status(problemCodes[problem.code]).set('Cache-Control', 'no-store');
    if (problem.retryAfterS !== undefined) res.set('Retry-After', String(Math.max(1, Math.ceil(problem.retryAfterS))));
    if (problem.code === 'too-large') res.set('Connection', 'close');
    res.type('application/problem+json').send(JSON.stringify(problemOf(problem, `urn:uuid:${requestIdOf(res)}`)));
    req.unpipe();
    req.resume();
  };
  // Express tells an error handler from others by its number of parameters.
  return Object.defineProperty(answer, 'length', { value: 4 });
}
