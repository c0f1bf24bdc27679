import { createLink } from '@/server/links/link-driver';
import { rehearsalParts } from '@/server/boot/rehearsal-parts';
import { rehearse } from '@/server/engine/rehearsal/rehearse';
import { sha256Hex } from '@/server/evaluation/sha256';
import { verifyChain } from '@/shared/archive/chain';
import type { SimulatedRun, StepRow } from '@/shared/archive/run-records';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { soakStart } from './board/soak-start';
import { WatchedBoard } from './board/watched-board';
import { soak } from './report';

/**
 * Nights of one virtual hour: the production engine and link drive the firmware on the emulated board. The first passes without trouble, each
 * other one has faults from its seed. One and two of them, or twenty as the second figure.
 */
const FIRST = 3;
const SECOND = 20;
const START_UTC_MS = Date.UTC(2000, 0, 1, 22);
const SWINGS = 14;
const DWELL_S = 250;
const FAULTS = ['link-drop', 'garbage', 'server-kill'];
const FAULTS_EACH = 6;
/** A dwell is as long as planned within the rounding of stamps and the jitter of their mapping to UTC. */
const DWELL_SPARE_S = 0.002;
/** A stamp is told in whole microseconds, and taken some µs after its edge. */
const STAMP_MS = 0.05;

const pair = (to: 'near' | 'far'): Step[] => [
  { kind: 'swing', to },
  { kind: 'dwell', for_s: DWELL_S },
];
const protocol: ProtocolDocument = {
  formatVersion: 1,
  name: 'A night of one hour',
  onInterruption: 'resume',
  steps: [{ kind: 'home' }, ...Array.from({ length: SWINGS / 2 }, () => [...pair('near'), ...pair('far')]).flat()],
};

/** When the swing number `n` is about half way, s after the start: 3.5 s of homing, 6.4 s to near, then 9.7 s from station to station. */
const inSwingS = (n: number) => 3.5 + 6.4 + DWELL_S * n + 9.7 * (n - 1) + 4.5;

/** Half of them in the middle of a swing, half in a dwell; other kinds at other places for each seed. */
const faultsOf = (seed: number): SimulatedRun['faults'] =>
  Array.from({ length: seed === 1 ? 0 : FAULTS_EACH }, (_, index) => ({
    kind: FAULTS[(index + seed) % FAULTS.length] as string,
    atS: Math.round(10 * (inSwingS(2 * index + 1) + (index % 2 === 0 ? ((seed * 7) % 40) / 10 - 2 : 20 + ((seed * 31) % 200)))) / 10,
  }));

interface NightFigures {
  seed: number;
  outcome: string;
  hourS: number;
  steps: number;
  lines: number;
  rows: number;
  /** Rows that a fault cut short, and edges that were lost for good: the row then says so by its uncertainty. */
  cutShort: number;
  notTold: number;
  violations: string[];
}

async function runNight(seed: number): Promise<NightFigures> {
  let board: WatchedBoard | null = null;
  const parts = rehearsalParts('board');
  const result = await rehearse(
    { start: soakStart(protocol, { seed, faults: faultsOf(seed) }), startUtcMs: START_UTC_MS },
    {
      ...parts,
      createLink,
      createController: ({ clock, rig, seed: boardSeed }) => {
        board = new WatchedBoard(clock, { rig, seed: boardSeed });
        return board.controller;
      },
    },
  );
  const watched = board as WatchedBoard | null;
  if (watched === null) throw new Error('the night had no board');
  const { outcome, steps: rows, simulatedS } = result;
  if (outcome !== 'finished') watched.note(`the night ended ${outcome}: ${result.facts.reason}`);
  if (!verifyChain(result.events, sha256Hex).valid) watched.note('the chain of events is broken');
  for (const words of wrongRows(rows, faultsOf(seed).length === 0)) watched.note(words);
  for (const words of unmeasured(rows, watched)) watched.note(words);
  const { steps, lines } = watched;
  return {
    ...{ seed, outcome, hourS: Math.round(simulatedS), steps, lines, rows: rows.length },
    cutShort: rows.filter((row) => row.outcome === 'cut short').length,
    notTold: result.events.filter(({ kind }) => kind === 'edge-not-told').length,
    violations: watched.violations,
  };
}

function wrongRows(rows: readonly StepRow[], undisturbed: boolean): string[] {
  return rows.flatMap((row) => {
    const lastedS = ((row.endUtcMs ?? NaN) - row.startUtcMs) / 1000;
    const where = `row ${row.seq} (${row.kind})`;
    if (!(lastedS >= 0)) return [`${where} has no end`];
    if (undisturbed && row.outcome !== 'done') return [`${where} is ${row.outcome}`];
    const whole = row.kind === 'dwell' && row.outcome === 'done';
    return whole && Math.abs(lastedS - DWELL_S) > DWELL_SPARE_S ? [`${where} lasted ${lastedS} s`] : [];
  });
}

/** Each swing's start and end must be steps that the pin made, within what the row itself says of their uncertainty. */
function unmeasured(rows: readonly StepRow[], { motions }: WatchedBoard): string[] {
  const offMs = (of: (motion: WatchedBoard['motions'][0]) => number, utcMs: number) =>
    motions.reduce((least, motion) => (Math.abs(utcMs - of(motion)) < Math.abs(least) ? utcMs - of(motion) : least), Infinity);
  return rows
    .filter(({ kind, outcome }, index) => kind === 'swing' && outcome === 'done' && rows[index - 1]?.kind === 'dwell')
    .flatMap(({ seq, startUtcMs, uStartS, endUtcMs, uEndS }) => {
      const began = offMs(({ firstUtcMs }) => firstUtcMs, startUtcMs);
      const ended = offMs(({ lastUtcMs }) => lastUtcMs, endUtcMs ?? NaN);
      return [
        ...(Math.abs(began) <= 3000 * uStartS + STAMP_MS ? [] : [`row ${seq} begins ${began} ms after the first step, u ${uStartS} s`]),
        ...(Math.abs(ended) <= 3000 * (uEndS ?? 0) + STAMP_MS ? [] : [`row ${seq} ends ${ended} ms after the last step, u ${uEndS} s`]),
      ];
    });
}

soak('night', async (args) => {
  const count = args.includes('--second') ? SECOND : FIRST;
  const nights: NightFigures[] = [];
  for (let seed = 1; seed <= count; seed += 1) {
    process.stderr.write(`night, seed ${seed}\n`);
    const night = await runNight(seed);
    nights.push(night);
    process.stderr.write(`night ${seed}: ${night.outcome}, ${night.steps} steps, ${night.violations.length} violations\n`);
  }
  return { ok: nights.every(({ violations }) => violations.length === 0), nights };
});
