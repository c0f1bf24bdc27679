import { join } from 'node:path';
import { LabClient, pause } from '../bench/lib/lab-client';
import { ServerProcess, type ServerSetting } from '../bench/lib/server-process';
import { soak } from './report';
import { countOf, driverOf, judged, listen, withRealNight, type RealNight } from './run/real-night';
import { networkRefusal, OwnNetwork } from './servers/own-network';

/**
 * Three servers on one database and one controller, which hears all of them. At some instant one of them is frozen (SIGSTOP) for 1 to 10 s or killed, every
 * connection to the controller breaks, the wall clock of one is set by a minute, all its connections to the database are ended, or its network is cut for
 * 1 to 10 s (each has a network namespace; where the machine allows none that deed is left out, and the result says why); 200 times, or 5 000 as the
 * second figure (`--rounds N`). The controller obeys one epoch at a time, another server has the rig within 5 s of the end of its driver, and a clock
 * that is set, or a standby's trouble, takes no rig from its driver.
 */
const FIRST = 200;
const SECOND = 5_000;
const PLACES = 3;
const LEASE_S = 3;
const TAKEN_OVER_WITHIN_S = 5;
const PATIENCE_MS = 30_000;
const allDeeds = ['freeze', 'kill', 'cut', 'clock', 'disconnect', 'network'] as const;
type Deed = (typeof allDeeds)[number];
const NODE_OPTIONS = `--require "${join(__dirname, 'servers', 'settable-clock.cjs')}"`;
/** Servers whose clock is set by a minute now, and which signal sets it right again. */
const astray = new Map<ServerProcess, 'SIGUSR2' | 'SIGHUP'>();

interface Placed {
  server: ServerProcess;
  place: number;
}

/** What the rounds share. */
interface Stage {
  night: RealNight;
  networks: readonly OwnNetwork[];
  deeds: readonly Deed[];
  takeoversS: number[];
  done: Partial<Record<Deed, number>>;
}

async function until(holds: () => boolean, withinMs: number): Promise<boolean> {
  for (const began = performance.now(); !holds(); await pause(10)) if (performance.now() - began > withinMs) return false;
  return true;
}

const serversOf = (all: readonly Placed[]) => all.map(({ server }) => server);

/** What becomes of the rig after one server's trouble. */
class Rig {
  private readonly epoch: number;
  private readonly beganMs = performance.now();

  constructor(
    private readonly stage: Stage,
    private readonly what: string,
  ) {
    this.epoch = stage.night.controller.epoch;
  }

  async isTakenOver(): Promise<void> {
    const { night, takeoversS } = this.stage;
    const { controller } = night;
    if (!(await until(() => controller.epoch > this.epoch, PATIENCE_MS)))
      controller.violations.push(`${this.what}: nobody took the rig over`);
    else takeoversS.push((performance.now() - this.beganMs) / 1000);
  }

  /** Long enough for a standby to take it, if it would. */
  async staysForS(seconds: number): Promise<void> {
    const { controller } = this.stage.night;
    if (await until(() => controller.epoch > this.epoch, 1000 * seconds))
      controller.violations.push(`${this.what}: the rig was taken from a driver that was well`);
  }
}

/** The database ends every connection of one server. */
async function endConnections({ database, controller }: RealNight, server: ServerProcess): Promise<void> {
  const name = new URL(server.setting.databaseUrl).searchParams.get('application_name');
  const { rowCount } = await database.connection.pool.query(
    'select pg_terminate_backend(pid) from pg_stat_activity where application_name = $1 and datname = current_database()',
    [name],
  );
  if (rowCount === 0) controller.violations.push(`${String(name)} had no connection to end`);
}

/** The clock of one server goes a minute ahead or back, and right again the next time. */
function setClock(server: ServerProcess, number: number): void {
  const signal = astray.get(server) ?? (Math.floor(number / allDeeds.length) % 2 === 0 ? 'SIGUSR2' : 'SIGHUP');
  if (!astray.delete(server)) astray.set(server, signal === 'SIGUSR2' ? 'SIGHUP' : 'SIGUSR2');
  server.signal(signal);
}

/** One deed to one server, `at`; the servers that are there afterwards. */
async function round(stage: Stage, all: readonly Placed[], number: number): Promise<readonly Placed[]> {
  const { night, networks, deeds } = stage;
  await pause(300 + ((number * 0.618) % 1) * 6_000);
  const driver = await driverOf(serversOf(all), night);
  await listen(night, driver);
  const last = Math.max(...night.told.keys());
  const deed = deeds[number % deeds.length] ?? 'cut';
  stage.done[deed] = (stage.done[deed] ?? 0) + 1;
  const driving = all.find(({ server }) => server === driver) as Placed;
  const others = all.filter((one) => one !== driving);
  // What a standby suffers matters too; freezing and killing is for the one that drives.
  const at = (Math.floor(number / deeds.length) % 3 === 2 ? others[0] : undefined) ?? driving;
  const drives = at === driving;
  const rig = new Rig(stage, `${deed} of ${drives ? 'the driver' : 'a standby'} in round ${String(number)}`);
  const troubleS = 1 + ((number * 0.414) % 1) * 9;
  let left = all;
  switch (deed) {
    case 'freeze': {
      driver.signal('SIGSTOP');
      const asleep = pause(1000 * troubleS).then(() => driver.signal('SIGCONT'));
      // One that wakes in time may have kept its lease; later there must be another.
      if (troubleS > LEASE_S + 1) await rig.isTakenOver();
      await asleep;
      break;
    }
    case 'kill': {
      await driver.end('SIGKILL');
      await rig.isTakenOver();
      left = [...others, await placed(night, number + PLACES, driving.place)];
      break;
    }
    case 'clock':
      setClock(at.server, number);
      await rig.staysForS(TAKEN_OVER_WITHIN_S);
      break;
    case 'disconnect':
      await endConnections(night, at.server);
      if (!drives) await rig.staysForS(TAKEN_OVER_WITHIN_S);
      break;
    case 'network': {
      const network = networks[at.place] as OwnNetwork;
      await network.cut();
      const apart = pause(1000 * troubleS).then(() => network.mend());
      if (!drives) await rig.staysForS(troubleS);
      else if (troubleS > LEASE_S + 1) await rig.isTakenOver();
      await apart;
      break;
    }
    default:
      night.controller.cutAll();
  }
  const next = await driverOf(serversOf(left), night);
  await new LabClient(next.address, night.cookie)
    .until(night.runId, ({ state, lastSeq, current }) => state === 'running' && lastSeq > last && current !== null)
    .catch((error: Error) => {
      throw new Error(`after ${deed} in round ${String(number)}: ${error.message}: ${String(error.cause)}`);
    });
  return left;
}

const placed = async (night: RealNight, number: number, place: number): Promise<Placed> => ({
  server: await ServerProcess.start(night.setting(number, place)),
  place,
});

soak('r5', async (args) => {
  const refused = networkRefusal();
  const networks: OwnNetwork[] = [];
  const besides = async (ports: readonly number[]) => {
    for (let place = 0; refused === null && place < PLACES; place += 1) networks.push(await OwnNetwork.make(ports));
    return (place: number): Partial<ServerSetting> => ({
      env: { NODE_OPTIONS },
      ...(networks[place] === undefined ? {} : { place: networks[place].place }),
    });
  };
  const night = (work: (night: RealNight, first: ServerProcess) => Promise<Record<string, unknown> & { ok: boolean }>) =>
    withRealNight(work, { besides }).finally(() => Promise.all(networks.map((network) => network.end())));
  return night(async (made, first) => {
    const rounds = countOf(args, { first: FIRST, second: SECOND });
    const deeds = allDeeds.filter((deed) => deed !== 'network' || refused === null);
    const stage: Stage = { night: made, networks, deeds, takeoversS: [], done: {} };
    let all: readonly Placed[] = [{ server: first, place: 0 }];
    try {
      for (let number = 1; number < PLACES; number += 1) all = [...all, await placed(made, number, number)];
      for (let number = 0; number < rounds; number += 1) all = await round(stage, all, number);
      const violations = await judged(made, await driverOf(serversOf(all), made));
      const slowest = Math.max(0, ...stage.takeoversS);
      if (slowest > TAKEN_OVER_WITHIN_S) violations.push(`the slowest takeover took ${slowest.toFixed(1)} s`);
      const { motions, epoch } = made.controller;
      return {
        ok: violations.length === 0,
        rounds,
        deeds: stage.done,
        network: refused === null ? 'cut in namespaces' : `not cut: ${refused}`,
        motions,
        epoch,
        takeovers: stage.takeoversS.length,
        slowestTakeoverS: slowest,
        violations,
      };
    } finally {
      await Promise.all(serversOf(all).map((server) => server.end()));
    }
  });
});
