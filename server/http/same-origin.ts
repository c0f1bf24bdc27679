import type { Request } from 'express';
import type { ServerConfig } from '../interfaces/server-config';
import { ProblemError } from './problem-error';

const safeMethods = new Set(['GET', 'HEAD', 'OPTIONS']);

/**
 * Refuses a changing request that another site made a browser send. Browsers name the relation in `Sec-Fetch-Site`
 * (W3C Fetch Metadata); where it is absent `Origin` must be our own.
 */
export function assertSameOrigin(req: Request, config: ServerConfig): void {
  if (safeMethods.has(req.method)) return;
  // No page of another site can add this header, and what it lets in needs no cookie.
  if (req.headers.authorization?.startsWith('Bearer ') === true) return;
  const site = req.headers['sec-fetch-site'];
  if (site === 'same-origin') return;
  const own = config.publicUrl ?? `${req.protocol}://${req.headers.host ?? ''}`;
  if (site === undefined && req.headers.origin === own) return;
  const came = site === undefined ? (req.headers.origin ?? 'neither Sec-Fetch-Site nor Origin') : `Sec-Fetch-Site ${String(site)}`;
  throw new ProblemError(
    'cross-site',
    `A request that changes something must come from ${own} itself; this one came with ${came}. A program sets the header Origin to ${own}.`,
  );
}
