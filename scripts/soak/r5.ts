import { join } from 'node:path';
import { LabClient, pause } from '../bench/lib/lab-client';
import { ServerProcess } from '../bench/lib/server-process';
import { soak } from './report';
import { countOf, driverOf, judged, listen, withRealNight, type RealNight } from './run/real-night';

/**
 * Three servers on one database and one controller, which hears all of them: at some instant the one that drives is frozen (SIGSTOP) for 1 to 10 s,
 * is killed, loses every connection to the controller or to the database, or the wall clock of one of the three is set by 60 s; 200 times, or 5 000 as the second figure
 * (`--rounds N`). The controller obeys one epoch at a time, another server has the rig within 5 s of the end of its driver, and no clock that is set takes the rig
 * from a driver that lives.
 */
const FIRST = 200;
const SECOND = 5_000;
const SERVERS = 3;
const LEASE_S = 3;
const TAKEN_OVER_WITHIN_S = 5;
const PATIENCE_MS = 30_000;
/** Long enough for a lease to end, were it to go by the clock that was set. */
const WATCHED_MS = 4_000;
const deeds = ['freeze', 'kill', 'cut', 'connections', 'clock'] as const;
/** Servers whose clock is set by a minute now, and which signal sets it right again. */
const astray = new Map<ServerProcess, 'SIGUSR2' | 'SIGHUP'>();
const NODE_OPTIONS = `--require "${join(__dirname, 'run', 'settable-clock.cjs')}"`;

/** The database ends every connection of one server. */
async function endConnections({ database, controller }: RealNight, server: ServerProcess): Promise<void> {
  const name = new URL(server.setting.databaseUrl).searchParams.get('application_name');
  const { rowCount } = await database.connection.pool.query(
    'select pg_terminate_backend(pid) from pg_stat_activity where application_name = $1 and datname = current_database()',
    [name],
  );
  if (rowCount === 0) controller.violations.push(`${String(name)} had no connection to end`);
}

/** The clock of one server goes a minute ahead or back, and right again the next time: the driver stays. */
async function setClock({ controller }: RealNight, { number, server }: { number: number; server: ServerProcess }): Promise<void> {
  const { epoch } = controller;
  const signal = astray.get(server) ?? (Math.floor(number / deeds.length) % 2 === 0 ? 'SIGUSR2' : 'SIGHUP');
  if (!astray.delete(server)) astray.set(server, signal === 'SIGUSR2' ? 'SIGHUP' : 'SIGUSR2');
  server.signal(signal);
  await pause(WATCHED_MS);
  if (controller.epoch !== epoch) controller.violations.push(`round ${String(number)}: a clock that was set took the rig from its driver`);
}

async function until(holds: () => boolean, withinMs: number): Promise<boolean> {
  for (const began = performance.now(); !holds(); await pause(10)) if (performance.now() - began > withinMs) return false;
  return true;
}

interface Round {
  number: number;
  servers: ServerProcess[];
  takeoversS: number[];
}

/** What happens to the one that drives; the servers that are there afterwards. */
async function round(night: RealNight, { number, servers, takeoversS }: Round): Promise<ServerProcess[]> {
  const { controller, cookie, runId } = night;
  await pause(300 + ((number * 0.618) % 1) * 6_000);
  const driver = await driverOf(servers, night);
  await listen(night, driver);
  const last = Math.max(...night.told.keys());
  const others = servers.filter((server) => server !== driver);
  const [epoch, beganMs] = [controller.epoch, performance.now()];
  const takenOver = async () => {
    if (!(await until(() => controller.epoch > epoch, PATIENCE_MS)))
      controller.violations.push(`round ${number}: nobody took the rig over`);
    else takeoversS.push((performance.now() - beganMs) / 1000);
  };
  let left = servers;
  const deed = deeds[number % deeds.length] ?? 'cut';
  switch (deed) {
    case 'freeze': {
      const frozenS = 1 + ((number * 0.414) % 1) * 9;
      driver.signal('SIGSTOP');
      const asleep = pause(1000 * frozenS).then(() => driver.signal('SIGCONT'));
      // One that wakes in time may have kept its lease; later there must be another.
      if (frozenS > LEASE_S + 1) await takenOver();
      await asleep;
      break;
    }
    case 'kill':
      await driver.end('SIGKILL');
      await takenOver();
      left = [...others, await ServerProcess.start(night.setting(number + SERVERS))];
      break;
    case 'connections':
      await endConnections(night, driver);
      break;
    case 'clock':
      await setClock(night, { number, server: (Math.floor(number / deeds.length) % 4 < 2 ? driver : others[0]) ?? driver });
      break;
    default:
      controller.cutAll();
  }
  const next = await driverOf(left, night);
  await new LabClient(next.address, cookie)
    .until(runId, ({ state, lastSeq, current }) => state === 'running' && lastSeq > last && current !== null)
    .catch((error: Error) => {
      throw new Error(`after ${deed} in round ${number}: ${error.message}: ${String(error.cause)}`);
    });
  return left;
}

soak('r5', (args) =>
  withRealNight(
    async (night, first) => {
      const rounds = countOf(args, { first: FIRST, second: SECOND });
      let servers = [first];
      try {
        for (let number = 1; number < SERVERS; number += 1) servers.push(await ServerProcess.start(night.setting(number)));
        const takeoversS: number[] = [];
        for (let number = 0; number < rounds; number += 1) servers = await round(night, { number, servers, takeoversS });
        const violations = await judged(night, await driverOf(servers, night));
        const slowest = Math.max(0, ...takeoversS);
        if (slowest > TAKEN_OVER_WITHIN_S) violations.push(`the slowest takeover took ${slowest.toFixed(1)} s`);
        const { motions, epoch } = night.controller;
        return {
          ok: violations.length === 0,
          rounds,
          deeds,
          motions,
          epoch,
          takeovers: takeoversS.length,
          slowestTakeoverS: slowest,
          violations,
        };
      } finally {
        await Promise.all(servers.map((server) => server.end()));
      }
    },
    { env: { NODE_OPTIONS } },
  ),
);
