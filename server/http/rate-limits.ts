import type { RequestHandler } from 'express';
import { rateLimit } from 'express-rate-limit';
import { ProblemError } from './problem-error';

/** At most `perMinute` requests a minute and address. */
export function limitRate(perMinute: number): RequestHandler {
  return rateLimit({
    windowMs: 60_000,
    limit: perMinute,
    standardHeaders: 'draft-8',
    legacyHeaders: false,
    handler: (_req, _res, next) => {
      next(
        new ProblemError(
          'too-many-requests',
          `More than ${String(perMinute)} requests came from your address within a minute. Wait a minute and try again.`,
        ),
      );
    },
  });
}
