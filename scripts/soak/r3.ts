import { LabClient, pause } from '../bench/lib/lab-client';
import { ServerProcess } from '../bench/lib/server-process';
import { soak } from './report';
import { countOf, judged, listen, withRealNight, type RealNight } from './run/real-night';

/**
 * The server is killed (SIGKILL) at some instant of a run of swings and another one is started at once: 100 times, or 2 000 as the second
 * figure (`--rounds N`). The controller goes on meanwhile and is watched: no motion begins twice, nothing that was told is lost, the run goes on.
 */
const FIRST = 100;
const SECOND = 2_000;
const LONGEST_CALM_MS = 8_000;

async function killed(
  night: RealNight,
  { server, number }: { server: ServerProcess; number: number },
): Promise<{ server: ServerProcess; tookS: number }> {
  await pause(300 + ((number * 0.618) % 1) * LONGEST_CALM_MS);
  await listen(night, server);
  const last = Math.max(...night.told.keys());
  const beganMs = performance.now();
  await server.end('SIGKILL');
  const next = await ServerProcess.start(night.setting());
  const lab = new LabClient(next.address, night.cookie);
  await lab.until(night.runId, ({ state, lastSeq, current }) => state === 'running' && lastSeq > last && current !== null);
  return { server: next, tookS: (performance.now() - beganMs) / 1000 };
}

soak('r3', (args) =>
  withRealNight(async (night, first) => {
    const rounds = countOf(args, { first: FIRST, second: SECOND });
    const tookS: number[] = [];
    let server = first;
    try {
      for (let number = 0; number < rounds; number += 1) {
        const after = await killed(night, { server, number });
        server = after.server;
        tookS.push(after.tookS);
      }
      const violations = await judged(night, server);
      const sorted = tookS.sort((a, b) => a - b);
      return {
        ok: violations.length === 0,
        rounds,
        motions: night.controller.motions,
        events: night.told.size,
        backAgainS: { p50: sorted[Math.floor(rounds / 2)], p99: sorted[Math.ceil(0.99 * rounds) - 1] },
        violations,
      };
    } finally {
      await server.end();
    }
  }),
);
