import { createServer, type Server } from 'node:http';
import { monitorEventLoopDelay } from 'node:perf_hooks';
import { sql } from 'drizzle-orm';
import type { BrokerStatus } from '@/shared/contracts/brokers';
import { gauge, metricsText, type Metric } from '../http/metrics';
import { readinessOf, type Readiness } from '../http/readiness';
import type { Services } from '../http/services';
import { allBrokers } from '../store/brokers';
import { allRigs } from '../store/rigs';
import type { DatabaseDisk } from './database-disk';
import { freeDisk } from './free-disk';

/** Figures of this process for Prometheus, on loopback alone: names of rigs are nobody else's business. */

const loopback = '127.0.0.1';
const nsPerS = 1e9;

export class MetricsPort {
  private server: Server | null = null;
  private readonly lag = monitorEventLoopDelay({ resolution: 20 });

  constructor(
    private readonly services: Services,
    private readonly databaseDisk: DatabaseDisk,
  ) {}

  /** @returns the port, or null where none was configured */
  async listen(port: number | null): Promise<number | null> {
    if (port === null) return null;
    this.lag.enable();
    const server = createServer((req, res) => {
      void this.answer(req.url ?? '').then(
        ({ status, type, text }) => res.writeHead(status, { 'content-type': type, 'cache-control': 'no-store' }).end(text),
        () => res.writeHead(503).end(),
      );
    });
    this.server = server;
    await new Promise<void>((resolve, reject) => {
      server.once('error', reject);
      server.listen(port, loopback, resolve);
    });
    return (server.address() as { port: number }).port;
  }

  async close(): Promise<void> {
    this.lag.disable();
    const { server } = this;
    if (server === null) return;
    await new Promise<void>((resolve) => {
      server.close(() => resolve());
      server.closeAllConnections();
    });
  }

  /** Those without the role `web` have no other place for `/healthz` and `/readyz`. */
  private async answer(path: string): Promise<{ status: number; type: string; text: string }> {
    if (path === '/metrics') return { status: 200, type: 'text/plain; version=0.0.4', text: await this.text() };
    if (path === '/healthz') return { status: 200, type: 'text/plain', text: 'ok\n' };
    if (path !== '/readyz') return { status: 404, type: 'text/plain', text: '' };
    const readiness = await readinessOf(this.services);
    return { status: readiness.ready ? 200 : 503, type: 'application/json', text: JSON.stringify(readiness) };
  }

  private async text(): Promise<string> {
    const { services } = this;
    const readiness = await readinessOf(services);
    const [free, ofDatabase] = await Promise.all([freeDisk(services.config.stateDir), this.databaseDisk.free()]);
    return metricsText([
      gauge('evenfall_database_up', 'Whether the database answers.', Number(readiness.database === 'answers')),
      rolesOf(readiness),
      ...(readiness.others === 'none'
        ? []
        : [gauge('evenfall_post_up', 'Whether other processes of this database are heard.', Number(readiness.others === 'heard'))]),
      gauge('evenfall_event_loop_lag_p99_seconds', 'How late the loop turns, 99th percentile since the last look.', this.lagS()),
      gauge('evenfall_memory_bytes', 'Memory of the process.', process.memoryUsage().rss),
      gauge('evenfall_uptime_seconds', 'Age of the process.', process.uptime()),
      ...(free === null ? [] : [gauge('evenfall_disk_free_ratio', 'Free part of the disk of the state folder.', free)]),
      ...(ofDatabase === null ? [] : [gauge('evenfall_database_disk_free_ratio', 'Free part of the disk of the database.', ofDatabase)]),
      gauge('evenfall_live_streams', 'Pages that follow a run or a line.', services.live.count() + services.lines.count()),
      ...services.answers.metrics(),
      ...(readiness.database === 'answers' ? [...(await this.rigs()), ...(await this.brokers()), ...(await this.work())] : []),
    ]);
  }

  private lagS(): number {
    const lag = this.lag.percentile(99) / nsPerS;
    this.lag.reset();
    return Number.isFinite(lag) ? lag : 0;
  }

  private async rigs(): Promise<Metric[]> {
    const { services } = this;
    const own = (await allRigs(services.database.db)).flatMap(({ id, name }) => {
      const station = services.stations.get(id);
      return station === null
        ? []
        : [{ labels: { rig: id, name }, health: station.link.health(), armed: services.arms.armOf(id) !== null }];
    });
    const each = (name: string, help: string, value: (rig: (typeof own)[number]) => number | null): Metric => ({
      ...{ name, help, type: 'gauge' },
      samples: own.flatMap((rig) => {
        const found = value(rig);
        return found === null ? [] : [{ labels: rig.labels, value: found }];
      }),
    });
    return [
      each('evenfall_rig_link_ready', 'Whether the controller of a rig answers.', ({ health }) => Number(health.condition === 'ready')),
      each('evenfall_rig_armed', 'Whether somebody on site answers for the rig.', ({ armed }) => Number(armed)),
      each('evenfall_rig_round_trip_p95_seconds', 'Time until the controller has answered.', ({ health }) =>
        health.roundTripP95Ms === null ? null : health.roundTripP95Ms / 1000,
      ),
      each('evenfall_rig_reconnects', 'How often the line was opened anew.', ({ health }) => health.reconnects),
      each('evenfall_rig_clock_u_seconds', 'Standard uncertainty of the controller’s clock.', ({ health }) => health.clockUS),
    ];
  }

  private async brokers(): Promise<Metric[]> {
    const { services } = this;
    const own = (await allBrokers(services.database.db)).flatMap(({ rigId, address, status }) =>
      services.stations.get(rigId) === null || status === null ? [] : [{ labels: { rig: rigId, address }, status }],
    );
    const each = (name: string, help: string, value: (status: BrokerStatus) => number): Metric => ({
      ...{ name, help, type: 'gauge' },
      samples: own.map(({ labels, status }) => ({ labels, value: value(status) })),
    });
    const sum = (counts: readonly number[]) => counts.reduce((all, count) => all + count, 0);
    return [
      each('evenfall_broker_up', 'Whether an MQTT broker of a rig is connected.', ({ state }) => Number(state === 'connected')),
      each('evenfall_broker_taken', 'Messages taken since the server listens.', ({ topics }) => sum(topics.map(({ taken }) => taken))),
      each('evenfall_broker_refused', 'Messages refused likewise.', ({ topics }) => sum(topics.map(({ refused }) => refused))),
    ];
  }

  private async work(): Promise<Metric[]> {
    const { db } = this.services.database;
    const jobs = await db.execute<{ state: string; count: number }>(
      sql`select state, count(*)::int as count from jobs where state <> 'done' group by state`,
    );
    const alarms = await db.execute<{ state: string; count: number }>(
      sql`select state, count(*)::int as count from alarms where state <> 'normal' group by state`,
    );
    const counted = (name: string, help: string, rows: { state: string; count: number }[]): Metric => ({
      ...{ name, help, type: 'gauge' },
      samples: rows.map(({ state, count }) => ({ labels: { state }, value: count })),
    });
    return [
      counted('evenfall_jobs', 'Work that waits, is at work or was given up.', jobs.rows),
      counted('evenfall_alarms', 'Alarms that are not at rest.', alarms.rows),
    ];
  }
}

const rolesOf = ({ roles }: Readiness): Metric => ({
  ...{ name: 'evenfall_role', type: 'gauge', help: 'What this process does.' },
  samples: roles.map((role) => ({ labels: { role }, value: 1 })),
});
