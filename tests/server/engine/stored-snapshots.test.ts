import { readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { verifyChain } from '@/shared/archive/chain';
import type { ChainedEvent, StepRow } from '@/shared/archive/run-records';
import { CHART_VERSION } from '@/server/engine/run-context';
import { RunDriver } from '@/server/engine/run-driver';
import { restored } from '@/server/engine/stored-snapshot';
import { makeBench, runStart, sha256, shortProtocol } from './rig-bench';

/** What every version of the engine left in the database, in each state a run can be left in (`ahead`: a move waits in the controller). */
interface Kept {
  snapshot: { state: string; context: { controller: { angleDeg: number | null } | null; deadlineUtcMs: number | null } };
  chartVersion: number;
  chain: { seq: number; hash: string };
  events: ChainedEvent[];
  steps: StepRow[];
}

const folder = join(__dirname, '../../fixtures/run-snapshots');
const kept = readdirSync(folder).flatMap((name) =>
  Object.entries(JSON.parse(readFileSync(join(folder, name), 'utf8')) as Record<string, Kept>).map(([state, run]) => ({
    version: run.chartVersion,
    state,
    run,
  })),
);

test('there are snapshots of every version up to this one, nine of each', () => {
  expect(kept.map(({ version }) => version)).toEqual(
    Array.from({ length: CHART_VERSION }, (_, index) => index + 1).flatMap((version) => Array<number>(9).fill(version)),
  );
});

/** All were written under `resume`: what a person asked for stays so, the rest goes on to its end. */
const ends: Record<string, string> = { holding: 'held', held: 'held', stopping: 'stopped' };

test.each(kept)('version $version, $state, is taken up by this version', async ({ state, run }) => {
  const start = runStart({ ...shortProtocol, onInterruption: 'resume' });
  const bench = makeBench(start);
  const lastUtcMs = Date.parse(run.events.at(-1)?.at ?? new Date(bench.clock.utcMs()).toISOString());
  await bench.pass((lastUtcMs - bench.clock.utcMs()) / 1000 + 5);
  bench.link.angleDeg = run.snapshot.context.controller?.angleDeg ?? 0;
  bench.store.events.push(...structuredClone(run.events));
  for (const row of run.steps) bench.store.rows.set(row.seq, structuredClone(row));
  const { snapshot, chartVersion, chain } = run;
  bench.store.stored = JSON.stringify({ start, snapshot, chartVersion, chain });
  bench.driver = new RunDriver({
    ...{ start, store: bench.store, journal: bench.journal, link: bench.link, clock: bench.clock, sha256 },
    stored: await bench.store.load(),
    armNow: () => bench.arm.now,
    perform: () => undefined,
  });
  bench.driver.recover();
  await bench.pass(400);
  expect(bench.driver.facts().state).toBe(ends[state] ?? 'finished');
  expect(bench.store.log().filter(({ outcome }) => outcome === null)).toEqual([]);
  expect(verifyChain(bench.store.events, sha256)).toMatchObject({ valid: true });
});

test('one of a version to come, or none at all, is left alone', () => {
  const [{ run }] = kept as [(typeof kept)[0]];
  expect(restored(run.snapshot, CHART_VERSION + 1)).toBeNull();
  expect(restored(run.snapshot, 0)).toBeNull();
  expect(restored(null, 1)).toBeNull();
});
