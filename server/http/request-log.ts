import type { RequestHandler, Response } from 'express';
import type { Services } from './services';

/** Number of the request in the log; the `instance` of its problem. */
export const requestIdOf = (res: Response): string => String(res.locals.requestId ?? '');

/**
 * One line for each request of the API: method, the route's pattern (its address may hold a token), status and time.
 * No headers, no bodies.
 */
export function logRequests(services: Pick<Services, 'log' | 'clock' | 'newId' | 'answers'>): RequestHandler {
  return (req, res, next) => {
    const startMs = services.clock.monotonicMs();
    res.locals.requestId = services.newId();
    res.once('finish', () => {
      if (!req.originalUrl.startsWith('/api/')) return;
      const route: unknown = (req as { route?: { path?: unknown } }).route?.path;
      const answer = { method: req.method, status: res.statusCode, ms: Math.round(services.clock.monotonicMs() - startMs) };
      services.answers.answered(answer);
      services.log.info({ requestId: requestIdOf(res), route: typeof route === 'string' ? route : null, ...answer }, 'answered');
    });
    next();
  };
}
