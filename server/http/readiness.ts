import type { RequestHandler } from 'express';
import { ping } from '../store/health';
import { allRigs } from '../store/rigs';
import { drivenRigs } from '../store/rig-leases';
import type { ProcessRole } from '../interfaces/server-config';
import type { Services } from './services';

/** Answers for whoever watches over the process: no session, no details. */

/** `/healthz`: the process turns its loop. */
export const healthz: RequestHandler = (_req, res) => {
  res.set('Cache-Control', 'no-store').type('text/plain').send('ok\n');
};

export interface Readiness {
  ready: boolean;
  roles: readonly ProcessRole[];
  database: 'answers' | 'away';
  /**
   * `driving`: this process drives every rig that it may. `waiting`: another one has them, or unfinished runs are being taken up. `away`: no
   * process drives them; told by those without the role `rig`, to which `elsewhere` means that others do.
   */
  rigs: 'driving' | 'waiting' | 'elsewhere' | 'away' | 'unknown';
  /** Whether what other processes say is heard; where one plays all roles there is nothing to be heard. */
  others: 'heard' | 'not heard' | 'none';
}

/** Whether requests can be served, and how it stands with the rigs. */
export async function readinessOf(services: Services): Promise<Readiness> {
  const { post } = services;
  const others = post === null ? 'none' : post.hears() ? 'heard' : 'not heard';
  const known = { roles: services.config.roles, others } as const;
  const away: Readiness = { ready: false, ...known, database: 'away', rigs: 'unknown' };
  if (!(await ping(services.database))) return away;
  try {
    return { ready: others !== 'not heard', ...known, database: 'answers', rigs: await rigsOf(services) };
  } catch {
    return away;
  }
}

async function rigsOf(services: Services): Promise<Readiness['rigs']> {
  const { db } = services.database;
  const rigs = (await allRigs(db)).filter(({ document }) => document.motion !== undefined);
  if (services.config.roles.includes('rig')) return rigs.every(({ id }) => services.stations.get(id) !== null) ? 'driving' : 'waiting';
  const driven = await drivenRigs(db);
  return rigs.every(({ id }) => driven.has(id)) ? 'elsewhere' : 'away';
}

/** `/readyz`: 200 while the database answers and the other processes are heard, else 503. */
export const readyz =
  (services: Services): RequestHandler =>
  async (_req, res) => {
    const readiness = await readinessOf(services);
    res
      .status(readiness.ready ? 200 : 503)
      .set('Cache-Control', 'no-store')
      .json(readiness);
  };
