import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import type { StepRow } from '@/shared/archive/run-records';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { startOf, startUtcMs } from '../run/night';
import { World } from '../run/world';

/** A short run while the wall clock of its server is set and runs at a rate of its own, from a seed: its log must look as if nothing had been. */

/** As an NTP client sets a clock that was never right, or whose battery is empty, ms. */
const SETS_MS = [-3_600_000, -1_000, 1_000, 3_600_000] as const;
const MOST_SETS = 4;
/** The wall clock gains or loses up to this against the time that durations are measured by. */
const GREATEST_RATE_PPM = 200;
const MS_PER_PPM = 1e-6;
const LASTS_MS = 88_000;
/** An instant that the controller told may be off by so much. */
const STAMP_MS = 5;

const protocol: ProtocolDocument = {
  formatVersion: 1,
  name: 'Set clocks',
  onInterruption: 'hold',
  steps: [
    { kind: 'home' },
    {
      kind: 'repeat',
      times: 2,
      steps: ['near', 'far'].flatMap((to) => [
        { kind: 'swing' as const, to },
        { kind: 'dwell' as const, for_s: 12 },
      ]),
    },
  ],
};

export interface ClockNight {
  seed: number;
  sets: { atMs: number; byMs: number }[];
  ratePpm: number;
  world: World;
}

export async function runClockNight(seed: number): Promise<ClockNight> {
  const random = xoroshiro128plus(seed * 15_485_863 + 3);
  const between = (least: number, greatest: number) => uniformInt(random, least, greatest);
  const world = new World(startOf(protocol), { seed, startUtcMs });
  const ratePpm = between(-GREATEST_RATE_PPM, GREATEST_RATE_PPM);
  world.machineClock.ratePpm = ratePpm;
  await world.begin();
  const sets: ClockNight['sets'] = [];
  for (let count = between(1, MOST_SETS); count > 0; count -= 1) {
    const byMs = SETS_MS[between(0, SETS_MS.length - 1)] as number;
    world.clock.after(between(0, LASTS_MS), () => {
      sets.push({ atMs: world.nowMs, byMs });
      world.machineClock.stepMs += byMs;
    });
  }
  await world.clock.advance(2 * LASTS_MS, () => world.done);
  world.kill();
  return { seed, sets, ratePpm, world };
}

const swings = (rows: readonly StepRow[]) => rows.filter(({ kind }) => kind === 'home' || kind === 'swing');

function wrongRow(rows: readonly StepRow[]): string | null {
  for (const [index, row] of rows.entries()) {
    if (row.endUtcMs === null || row.endUtcMs < row.startUtcMs) return `the row ${row.seq} ends before it begins`;
    const next = rows[index + 1];
    if (next !== undefined && next.startUtcMs < row.endUtcMs - STAMP_MS) return `the row ${next.seq} begins before the one before it ends`;
  }
  return null;
}

/** Against the instants at which the controller truly began, and their distances. */
function wrongStamp(rows: readonly StepRow[], { ratePpm, world }: ClockNight): string | null {
  const { began } = world.witness;
  if (began.length !== rows.length) return `${began.length} motions began, and there are ${rows.length} rows of them`;
  for (const [index, row] of rows.entries()) {
    const atMs = began[index]?.atMs ?? NaN;
    const offMs = row.startUtcMs - (startUtcMs + atMs * (1 + ratePpm * MS_PER_PPM));
    if (!(Math.abs(offMs) <= STAMP_MS)) return `the stamp of row ${row.seq} is off by ${offMs.toFixed(1)} ms`;
    if (row.outcome !== 'done') return `the row ${row.seq} came to ${String(row.outcome)}`;
  }
  return null;
}

/** What is wrong with the log of a run whose server's clock was set, with all that is needed to look at it again. */
export function wrongWithClocks(night: ClockNight): string[] {
  const { seed, sets, ratePpm, world } = night;
  const rows = [...world.store.rows.values()].sort((a, b) => a.seq - b.seq);
  const times = world.store.events.map(({ at }) => Date.parse(at));
  const back = times.findIndex((at, index) => index > 0 && at < (times[index - 1] as number) - STAMP_MS);
  const told = world.store.events.filter(({ kind }) => kind === 'clock-stepped').length;
  const going = sets.filter(({ atMs }) => atMs < (world.witness.began.at(-1)?.atMs ?? 0)).length;
  const wrong = [
    world.state === 'finished' ? null : `the run is ${world.state}`,
    back < 0 ? null : `the event ${back + 1} is older than the one before it`,
    told >= Math.min(1, going) ? null : 'the log does not say that the clock was set',
    wrongRow(rows),
    wrongStamp(swings(rows), night),
  ];
  const how = `seed ${seed} (${ratePpm} ppm; ${sets.map(({ atMs, byMs }) => `${byMs} ms at ${atMs.toFixed(0)}`).join('; ')})`;
  return wrong.flatMap((one) => (one === null ? [] : [`${how}: ${one}`]));
}
