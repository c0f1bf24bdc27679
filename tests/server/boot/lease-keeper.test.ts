import pino from 'pino';
import { demoIds, seedDemo } from '@/db/demo/seed';
import { LeaseKeeper } from '@/server/boot/lease-keeper';
import { VirtualClock } from '@/server/engine/virtual-clock';
import { databaseOfThisFile } from '@/tests/support/database';
import { sha256 } from '@/tests/support/lab-server';

const database = databaseOfThisFile();
const rig = { labId: demoIds.lab, rigId: demoIds.rig };
const startUtcMs = Date.UTC(2031, 1, 14, 20);
const leaseMs = 3_000;

test('a lease that is being renewed while the server ends is free for the next one at once', async () => {
  const { connection } = database();
  await seedDemo(connection, { nowUtcMs: startUtcMs, hashPassword: async () => 'no password in this test', sha256 });
  const clock = new VirtualClock(startUtcMs, async () => undefined);
  const keeper = (holder: string) =>
    new LeaseKeeper({ database: connection, clock, log: pino({ level: 'silent' }), holder, leaseMs, onLost: () => undefined });
  for (let round = 1; round <= 10; round += 1) {
    const first = keeper(`first ${round}`);
    expect(await first.epochOf(rig)).not.toBeNull();
    first.renewRegularly();
    await clock.advance(leaseMs / 3);
    await first.close();
    const next = keeper(`next ${round}`);
    expect(await next.epochOf(rig)).not.toBeNull();
    await next.close();
  }
});
