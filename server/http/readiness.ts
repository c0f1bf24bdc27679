import type { RequestHandler } from 'express';
import { ping } from '../store/health';
import { allRigs } from '../store/rigs';
import type { Services } from './services';

/** Answers for whoever watches over the process: no session, no details. */

/** `/healthz`: the process turns its loop. */
export const healthz: RequestHandler = (_req, res) => {
  res.set('Cache-Control', 'no-store').type('text/plain').send('ok\n');
};

export interface Readiness {
  ready: boolean;
  database: 'answers' | 'away';
  /** `driving`: it drives every rig that it may. `waiting`: another server has them, or unfinished runs are being taken up. */
  rigs: 'driving' | 'waiting' | 'unknown';
}

/** Whether requests can be served, and how it stands with the rigs. */
export async function readinessOf(services: Services): Promise<Readiness> {
  const away: Readiness = { ready: false, database: 'away', rigs: 'unknown' };
  if (!(await ping(services.database))) return away;
  try {
    const rigs = await allRigs(services.database.db);
    const driving = rigs.every(({ id, document }) => document.motion === undefined || services.stations.get(id) !== null);
    return { ready: true, database: 'answers', rigs: driving ? 'driving' : 'waiting' };
  } catch {
    return away;
  }
}

/** `/readyz`: 200 while the database answers, else 503. */
export const readyz =
  (services: Services): RequestHandler =>
  async (_req, res) => {
    const readiness = await readinessOf(services);
    res
      .status(readiness.ready ? 200 : 503)
      .set('Cache-Control', 'no-store')
      .json(readiness);
  };
