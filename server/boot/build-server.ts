import { createServer, type Server } from 'node:http';
import type { AddressInfo } from 'node:net';
import type { Express } from 'express';
import { createApp } from '../http/create-app';
import { allRoutes } from '../http/routes';
import type { Services } from '../http/services';
import { CameraWatch } from '../http/work/camera-watch';
import { BrokerWatch } from '../http/work/broker-watch';
import { heedSchedules } from '../http/work/scheduled-starts';
import { sendSigns } from '../http/work/signs-of-life';
import { askForThinning } from '../http/work/thinning-job';
import { tidyFiles } from '../http/work/tidy-files';
import { openMqttLine } from '../ingest/mqtt-line';
import type { Cancel } from '../interfaces/clock';
import { startTicks, type Chore } from '../scheduler/ticks';
import { keepHouse } from '../store/housekeeping';
import { allRigs } from '../store/rigs';
import { anchorAudit } from './audit-anchor';
import type { BuildParts } from './build-parts';
import { buildServices, type Inside } from './build-services';
import { MetricsPort } from './metrics-port';

export interface BuiltServer {
  app: Express;
  services: Services & {
    /** Resolves when all run drivers, sample sinks, jobs and background writes have nothing in hand. */
    idle(): Promise<void>;
  };
  /** Opens the rigs' lines, takes up unfinished runs, begins to work off jobs. */
  start(): Promise<void>;
  /** Lets go of everything; runs go on as their protocols say when the next server takes them up. The database stays open. */
  stop(): Promise<void>;
  /** Serves on the host and port of the configuration, and to watchers. Returns the address. */
  listen(): Promise<string>;
  /** Answers whoever watches over the process, where a port for that is configured: all that one without the role `web` serves. */
  listenToWatchers(): Promise<void>;
}

/** The whole server out of its parts; nothing runs before `start`. */
export function buildServer(parts: BuildParts): BuiltServer {
  const { services, inside } = buildServices(parts);
  const app = createApp(services, allRoutes);
  const server = createServer(app);
  const life = new Life(services, inside, parts);
  const metrics = new MetricsPort(services, inside.databaseDisk);
  const listenToWatchers = async () => {
    services.config.metricsPort = await metrics.listen(services.config.metricsPort);
  };
  return {
    app,
    services: Object.assign(services, { idle: () => idle(services, inside) }),
    start: () => life.start(),
    stop: async () => {
      await life.stop();
      await metrics.close();
      await closeServer(server);
    },
    listen: async () => {
      await listenToWatchers();
      return listen(server, services);
    },
    listenToWatchers,
  };
}

/** What begins and ends with the server. */
class Life {
  private cancelRefresh: Cancel = () => undefined;
  private ticks: { stop(): Promise<void> } | null = null;
  private stopped = false;
  private readonly brokers: BrokerWatch;
  private readonly cameras: CameraWatch;

  constructor(
    private readonly services: Services,
    private readonly inside: Inside,
    private readonly parts: BuildParts,
  ) {
    const { paceMs } = parts.overrides ?? {};
    const holds = (rigId: string) => inside.leases.holds(rigId);
    this.brokers = new BrokerWatch({ services, holds, open: openMqttLine, paceMs });
    this.cameras = new CameraWatch({ services, holds, paceMs });
  }

  async start(): Promise<void> {
    const { services, inside } = this;
    const { db } = services.database;
    const { roles } = services.config;
    await services.post?.open();
    if (roles.includes('rig')) {
      // From the first lease on: to take many rigs up may last longer than a lease.
      inside.leases.renewRegularly();
      await inside.takeRigs(await allRigs(db));
      this.refreshRegularly();
    }
    inside.tellTakenUp();
    // It may have been ended while it was still taking rigs up: then nothing else begins.
    if (this.stopped) return;
    // What could be slow comes after the rigs.
    inside.background.add(keepHouse(db, services.clock.utcMs()), 'keeping house');
    inside.background.add(tidyFiles(services), 'tidying files');
    if (roles.includes('worker')) inside.crew.start();
    if (roles.includes('rig')) {
      inside.watch.start();
      this.brokers.start();
      this.cameras.start();
    }
    if (this.parts.overrides?.ticks ?? services.config.mode !== 'test') this.ticks = startTicks(this.chores(), services.log);
  }

  async stop(): Promise<void> {
    const { services, inside } = this;
    this.stopped = true;
    this.cancelRefresh();
    inside.watch.stop();
    const watchesStopped = Promise.all([this.brokers.stop(), this.cameras.stop()]);
    services.live.close();
    services.lines.close();
    services.guided.closeAll();
    inside.across.close();
    services.supervisor.close();
    const crewStopped = inside.crew.stop();
    await inside.closeTasks();
    await Promise.all([crewStopped, watchesStopped, this.ticks?.stop()]);
    await inside.stations.close();
    await inside.apparatus.end();
    inside.arming.close();
    inside.arms.close();
    inside.locks.close();
    await inside.background.idle();
    services.objects.close();
    await inside.leases.close();
    await services.post?.close();
  }

  /** What is due at its time of day: starts where the rigs are, all else with the jobs. */
  private chores(): Chore[] {
    const { services } = this;
    const { db } = services.database;
    const { roles, stateDir } = services.config;
    const ofRigs = [{ name: 'heed schedules', cron: '* * * * *', work: () => heedSchedules(services) }];
    const ofWorkers = [
      { name: 'signs of life', cron: '* * * * *', work: () => sendSigns(services) },
      { name: 'keep house', cron: '7 * * * *', work: () => keepHouse(db, services.clock.utcMs()) },
      { name: 'tidy files', cron: '17 * * * *', work: () => tidyFiles(services) },
      { name: 'thin samples', cron: '41 11 * * *', work: () => askForThinning(services) },
      { name: 'anchor the audit', cron: '11 4 * * *', work: () => anchorAudit(db, { stateDir, nowUtcMs: services.clock.utcMs() }) },
    ];
    return [...(roles.includes('rig') ? ofRigs : []), ...(roles.includes('worker') ? ofWorkers : [])];
  }

  /** Rigs that were made through another process since. */
  private async takeNewRigs(): Promise<void> {
    const { services, inside } = this;
    const unknown = (await allRigs(services.database.db)).filter(({ id }) => !inside.leases.knows(id));
    if (unknown.length > 0 && !this.stopped) await inside.takeRigs(unknown);
  }

  /** Whoever signed in since must be able to hold and stop when the database goes away. */
  private refreshRegularly(): void {
    const { services } = this;
    this.cancelRefresh = services.clock.after(refreshMs, () => {
      services.background(services.access.refresh(services.watchedLabs()), 'copying sessions into memory');
      if (services.post !== null) services.background(this.takeNewRigs(), 'taking new rigs');
      if (!this.stopped) this.refreshRegularly();
    });
  }
}

const refreshMs = 60_000;

async function idle(services: Services, inside: Inside): Promise<void> {
  await services.breathe();
  await services.supervisor.idle();
  await Promise.all([inside.stations.idle(), inside.crew.idle(), inside.background.idle(), inside.leases.idle()]);
  await services.supervisor.idle();
}

function listen(server: Server, services: Services): Promise<string> {
  const { host, port } = services.config;
  return new Promise((resolve, reject) => {
    server.once('error', reject);
    server.listen(port, host, () => {
      server.off('error', reject);
      services.config.port = (server.address() as AddressInfo).port;
      resolve(`http://${host.includes(':') ? `[${host}]` : host}:${String(services.config.port)}`);
    });
  });
}

function closeServer(server: Server): Promise<void> {
  return new Promise((resolve) => {
    server.close(() => resolve());
    server.closeAllConnections();
  });
}
