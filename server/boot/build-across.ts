import { randomUUID } from 'node:crypto';
import type { Logger } from 'pino';
import type { EndedAccess } from '../http/access-directory';
import { HereDesk } from '../http/desk/here-desk';
import { AcrossDesk } from '../http/desk/across-desk';
import { AcrossOutlook } from '../http/desk/across-outlook';
import { DeskClerk } from '../http/desk/desk-clerk';
import { HereOutlook, type RigOutlook } from '../http/desk/rig-outlook';
import type { RigDesk } from '../http/desk/rig-desk';
import { RigTeller } from '../http/desk/rig-teller';
import { allRoutes } from '../http/routes';
import type { LiveHub } from '../http/live/live-hub';
import type { Services } from '../http/services';
import type { Clock } from '../interfaces/clock';
import type { ArrivedSamples, ProcessMessage, ProcessPost } from '../interfaces/process-post';
import { processRoles, type ServerConfig } from '../interfaces/server-config';
import { DatabasePost } from '../store/process-post';
import { listRigs } from '../store/rigs';
import type { BuildParts } from './build-parts';
import type { RigSide } from './build-rigs';

/** The post of a process that does not play all roles; null where one does, which has nobody to speak to. */
export function createPost({ config, database, engineDatabase, clock, overrides }: BuildParts, log: Logger): ProcessPost | null {
  if (overrides?.post !== undefined) return overrides.post;
  if (processRoles.every((role) => config.roles.includes(role))) return null;
  return new DatabasePost({ process: randomUUID(), url: config.databaseUrl, database: engineDatabase ?? database, clock, log });
}

export interface AcrossWiring {
  post: ProcessPost | null;
  clock: Clock;
  log: Logger;
  newId(): string;
  services: () => Services;
  side: Pick<RigSide, 'leases' | 'arms' | 'locks'>;
  live: LiveHub;
  /** Keeps samples that have just come, for the conditions of runs and for those who watch. */
  keep(samples: ArrivedSamples): void;
  pokeJobs(): void;
}

export interface Across {
  desk: RigDesk;
  outlook: RigOutlook;
  /** What other processes are told, too. */
  told: Pick<Services, 'arrived' | 'runChanged'> & {
    /** Something happened on a rig. */
    rigChanged(rigId: string): void;
    /** A simulated rig measured something. */
    measured(samples: ArrivedSamples): void;
    jobsQueued(): void;
    accessEnded(ended: EndedAccess): void;
  };
  close(): void;
}

/** How this process answers for rigs, or asks those that drive them. */
export function buildAcross({ roles }: ServerConfig, wiring: AcrossWiring): Across {
  const { post, services, live } = wiring;
  const here = new HereDesk(
    allRoutes.filter(({ atTheRig }) => atTheRig !== undefined),
    services,
  );
  const outlook = new HereOutlook(services);
  if (post === null) return { desk: here, outlook, told: telling(wiring, null), close: () => undefined };
  const { clock, log, newId } = wiring;
  const drives = (rigId: string) => wiring.side.leases.holds(rigId);
  const onError = (error: unknown) => log.debug({ err: error }, 'other processes could not be told');
  const teller = new RigTeller({ post, clock, outlook, drives, onError });
  const told = telling(wiring, teller);
  post.onMessage((message) => hear(message, wiring));
  post.onGap(() => live.reopen());
  if (roles.includes('rig')) {
    const clerk = new DeskClerk({
      ...{ post, here, drives },
      databaseAwaySinceUtcMs: () => services().databaseAwaySinceUtcMs(),
      onError: (error, { route }) => log.error({ err: error, route }, 'a question of another process failed'),
      background: (work, what) => services().background(work, what),
    });
    return { desk: here, outlook, told, close: () => (clerk.close(), teller.close()) };
  }
  const desk = new AcrossDesk({ post, clock, newId, here, recall: (labId, isMeant) => recall(wiring, labId, isMeant) });
  const across = new AcrossOutlook({ post, clock, desk });
  return { desk, outlook: across, told, close: () => (across.close(), teller.close()) };
}

function telling({ live, keep }: AcrossWiring, teller: RigTeller | null): Across['told'] {
  return {
    arrived: (rigId, channel, { utcMs, value }) => {
      keep({ rigId, channel, utcMs, value });
      teller?.fromDevice({ rigId, channel, utcMs, value });
    },
    measured: (samples) => {
      keep(samples);
      teller?.sampled(samples);
    },
    runChanged: (runId, change) => {
      live.changed(runId, change);
      teller?.runChanged(runId, change);
    },
    rigChanged: (rigId) => teller?.rigChanged(rigId),
    jobsQueued: () => teller?.tell({ kind: 'jobs' }),
    accessEnded: (ended) => teller?.tell({ kind: 'access-ended', ended }),
  };
}

function hear(message: ProcessMessage, { services, live, keep, pokeJobs }: AcrossWiring): void {
  if (message.kind === 'run') live.changed(message.runId, message.change);
  else if (message.kind === 'samples') keep(message);
  else if (message.kind === 'jobs') pokeJobs();
  else if (message.kind === 'access-ended') {
    live.endAccess(message.ended);
    services().lines.endAccess(message.ended);
  }
}

/** Reads arms and locks of rigs that no process drives: nobody keeps them in memory. */
async function recall({ services, side }: AcrossWiring, labId: string, isMeant: (rigId: string) => boolean): Promise<void> {
  for (const { id: rigId } of await listRigs(services().database.db, labId)) {
    if (!isMeant(rigId)) continue;
    await side.arms.load({ labId, rigId });
    await side.locks.load({ labId, rigId });
  }
}
