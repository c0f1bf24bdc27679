import { LabClient, pause } from '@/scripts/bench/lib/lab-client';
import { ServerProcess } from '@/scripts/bench/lib/server-process';
import { eventsOf } from '@/scripts/bench/lib/swings';
import { DatabaseDoor } from '@/scripts/soak/run/database-door';
import { driverOf, judged, listen, withRealNight, type RealNight } from '@/scripts/soak/run/real-night';

/**
 * Real servers on a real database and a controller that outlives them: a slice of `npm run soak -- r3 r4 r5`. More rounds by
 * `EVENFALL_REAL_ROUNDS`; each costs a server.
 */
jest.setTimeout(600_000);
const ROUNDS = Number(process.env['EVENFALL_REAL_ROUNDS'] ?? 10);
const FREEZES = 2;
const FROZEN_MS = 1_000;

/** What was told is kept, and the run goes on after it. */
async function goesOn(night: RealNight, servers: readonly ServerProcess[], deed: (driver: ServerProcess) => Promise<void>) {
  const driver = await driverOf(servers, night);
  await listen(night, driver);
  const last = Math.max(...night.told.keys());
  await deed(driver);
  const living = servers.filter((server) => server.isAlive());
  const next = await driverOf(living, night);
  await new LabClient(next.address, night.cookie).until(night.runId, ({ state, lastSeq }) => state === 'running' && lastSeq > last);
  return next;
}

/** Somebody holds while the database cannot be reached: answered at once, and in the log when it is back. */
async function outage(night: RealNight, server: ServerProcess, door: { cut(): void; open(): void }): Promise<void> {
  const lab = new LabClient(server.address, night.cookie);
  await listen(night, server);
  door.cut();
  expect((await lab.intervene(night.runId, 'hold')).status).toBe(202);
  await lab.until(night.runId, ({ reason }) => reason.includes('away since'));
  door.open();
  await lab.until(night.runId, ({ state, reason }) => state === 'held' && !reason.includes('away since'));
  await lab.resume(night.runId);
  await lab.until(night.runId, ({ state }) => state === 'running');
}

test('a server that is frozen, cut off from controller and database, and killed: nothing is lost or moved twice, another takes over, and the log says which', async () => {
  const door = await DatabaseDoor.build();
  const port = Number(new URL(process.env['EVENFALL_DATABASE_ADMIN_URL'] ?? '').port || 5432);
  const opens = () => door.open(port);
  opens();
  const work = async (night: RealNight, first: ServerProcess) => {
    let servers = [first];
    try {
      for (let number = 0; number < FREEZES; number += 1)
        await goesOn(night, servers, async (driver) => {
          driver.signal('SIGSTOP');
          await pause(FROZEN_MS);
          driver.signal('SIGCONT');
        });
      await goesOn(night, servers, async () => night.controller.cutAll());
      await outage(night, first, { cut: () => door.cut(), open: opens });
      for (let number = 1; number <= ROUNDS; number += 1) {
        servers = [...servers, await ServerProcess.start(night.setting(number))];
        const next = await goesOn(night, servers, (driver) => driver.end('SIGKILL'));
        servers = servers.filter((server) => server.isAlive());
        const taken = (await eventsOf(new LabClient(next.address, night.cookie), night.runId)).filter(
          ({ kind, data }) => kind === 'server-restarted' && String(data['takenUpBy']).startsWith(`process ${next.pid} of `),
        );
        expect(taken.length).toBeGreaterThan(0);
      }
      const driver = await driverOf(servers, night);
      const lab = new LabClient(driver.address, night.cookie);
      expect((await lab.intervene(night.runId, 'stop')).status).toBe(202);
      await lab.until(night.runId, ({ state }) => state === 'stopped');
      const kinds = (await eventsOf(lab, night.runId)).map(({ kind }) => kind);
      expect(kinds.filter((kind) => kind === 'hold-requested')).toHaveLength(1);
      expect(await judged(night, driver)).toEqual([]);
      expect(night.controller.motions).toBeGreaterThan(2);
    } finally {
      for (const server of servers) server.signal('SIGCONT');
      await Promise.all(servers.map((server) => server.end()));
    }
  };
  await withRealNight(work, { armed: true, through: (url) => door.through(url) }).finally(() => door.end());
});
