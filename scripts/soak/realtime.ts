import { RealClock } from '@/server/boot/real-clock';
import { MemoryJournal } from '@/server/engine/memory-journal';
import { RehearsalStore } from '@/server/engine/rehearsal/rehearsal-store';
import { RunDriver } from '@/server/engine/run-driver';
import { sha256Hex } from '@/server/evaluation/sha256';
import { createLink } from '@/server/links/link-driver';
import { serialFactory } from '@/server/links/serial-line';
import { verifyChain } from '@/shared/archive/chain';
import type { StepRow } from '@/shared/archive/run-records';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { motionOf } from '@/shared/protocol/durations';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { ControllerProcess, sleep } from './board/controller-process';
import { soakStart } from './board/soak-start';
import { soak } from './report';

/**
 * Five minutes of real time, or half an hour as the second figure: the production engine and link, the real serial port class, a pseudo-terminal and the
 * firmware on the emulated board as a process. In each round the board's process stands still for a second in a swing (the motion must not mind), and
 * for three in a dwell, and the plug is out for eight seconds in another dwell (the run must go on by itself).
 */
const FIRST = 1;
const SECOND = 6;
const DWELL_S = 62;
const STALL_IN_SWING_MS = 1_000;
const STALL_IN_DWELL_MS = 3_000;
const UNPLUGGED_MS = 8_000;
const READY_WITHIN_MS = 20_000;
const LOOK_MS = 100;
/** Instants of a busy machine are only as good as the row itself says; then the rounding of a stamp. */
const SIGMAS = 4;
const STAMP_MS = 0.05;

const pair = (to: 'near' | 'far', label = ''): Step[] => [
  { kind: 'swing', to },
  { kind: 'dwell', for_s: DWELL_S, label },
];
const protocolOf = (rounds: number): ProtocolDocument => ({
  formatVersion: 1,
  name: 'In real time',
  onInterruption: 'resume',
  steps: [
    { kind: 'home' },
    ...Array.from({ length: rounds }, () => [...pair('near'), ...pair('far', 'stall'), ...pair('near', 'unplug'), ...pair('far')]).flat(),
  ],
});

/** Does what is to be done to the board when the run comes to a row, once for each. */
class Troubles {
  stalls = 0;
  unplugged = 0;
  private lastSeq = 0;

  constructor(private readonly board: ControllerProcess) {}

  async at({ seq, kind, label }: StepRow, stationFar: boolean): Promise<void> {
    if (seq === this.lastSeq) return;
    this.lastSeq = seq;
    if (kind === 'swing' && stationFar) await this.stall(2_000, STALL_IN_SWING_MS);
    if (label === 'stall') await this.stall(10_000, STALL_IN_DWELL_MS);
    if (label !== 'unplug') return;
    await sleep(10_000);
    await this.board.unplug();
    await sleep(UNPLUGGED_MS);
    await this.board.plug();
    this.unplugged += 1;
  }

  private async stall(afterMs: number, forMs: number): Promise<void> {
    await sleep(afterMs);
    this.board.stall();
    await sleep(forMs);
    this.board.goOn();
    this.stalls += 1;
  }
}

function wrongRows(rows: readonly StepRow[]): string[] {
  return rows.flatMap(({ seq, kind, outcome, startUtcMs, plannedStartUtcMs, endUtcMs, uStartS, uEndS }, index) => {
    const where = `row ${seq} (${kind})`;
    const spareMs = 1000 * SIGMAS * Math.hypot(uStartS, uEndS ?? 0) + STAMP_MS;
    const lastedS = ((endUtcMs ?? NaN) - startUtcMs) / 1000;
    const late = kind === 'swing' && rows[index - 1]?.kind === 'dwell' ? startUtcMs - plannedStartUtcMs : 0;
    return [
      ...(outcome === 'done' ? [] : [`${where} is ${outcome}`]),
      ...(kind !== 'dwell' || Math.abs(lastedS - DWELL_S) * 1000 <= spareMs
        ? []
        : [`${where} lasted ${lastedS} s, u ${spareMs / SIGMAS} ms`]),
      ...(Math.abs(late) <= spareMs ? [] : [`${where} began ${late} ms off its time`]),
    ];
  });
}

const greatestUMs = (rows: readonly StepRow[]) => 1000 * Math.max(...rows.flatMap(({ uStartS, uEndS }) => [uStartS, uEndS ?? 0]));

async function drive(rounds: number) {
  const clock = new RealClock();
  const board = new ControllerProcess(['--board', '--homed']);
  await board.start();
  const rig = motionOf(demoRigWide);
  const link = createLink({ factory: serialFactory({ path: board.path, baudRate: 115_200, dtr: true }, clock), clock, rig, epoch: 1 });
  link.open();
  for (const giveUpMs = clock.monotonicMs() + READY_WITHIN_MS; link.health().condition !== 'ready'; await sleep(LOOK_MS))
    if (clock.monotonicMs() > giveUpMs) throw new Error(`the link is ${link.health().condition}: ${link.health().detail}`);
  const start = soakStart(protocolOf(rounds), { seed: 1 });
  const store = new RehearsalStore(start);
  const errors: string[] = [];
  const driver = new RunDriver({
    ...{ start, stored: null, store, journal: new MemoryJournal(), link, clock, sha256: sha256Hex },
    armNow: () => null,
    perform: () => undefined,
    onError: (error) => void errors.push(String(error)),
  });
  driver.start();
  const troubles = new Troubles(board);
  while (!driver.isOver() && driver.state().state !== 'held') {
    const row = store.steps().at(-1);
    if (row !== undefined) await troubles.at(row, row.station === 'far');
    await sleep(LOOK_MS);
  }
  const { angleDeg } = JSON.parse(await board.tell('angle')) as { angleDeg: number };
  const { roundTripP50Ms, roundTripP95Ms, discardedLines, retries, reconnects, driftPpm } = link.health();
  driver.close();
  await link.close();
  await board.dispose();
  const rows = store.steps();
  const count = (kind: string) => store.events.filter((event) => event.kind === kind).length;
  const off = angleDeg - (demoRigWide.stations['far']?.value ?? NaN);
  const violations = [
    ...errors,
    ...wrongRows(rows),
    ...(driver.state().state === 'finished' ? [] : [`the run is ${driver.state().state}: ${driver.facts().reason}`]),
    ...(Math.abs(off) <= 0.5 / rig.stepsPerDegree + 1e-9 ? [] : [`the table stands ${off} deg off its station`]),
    ...(verifyChain(store.events, sha256Hex).valid ? [] : ['the chain of events is broken']),
    ...(count('link-lost') === troubles.unplugged
      ? []
      : [`the line was lost ${count('link-lost')} times, unplugged ${troubles.unplugged} times`]),
    ...(count('edge-not-told') === 0 ? [] : ['an edge of a motion was never told']),
  ];
  const figures = { roundTripP50Ms, roundTripP95Ms, discardedLines, retries, reconnects, driftPpm, greatestUMs: greatestUMs(rows) };
  return { rows: rows.length, stalls: troubles.stalls, unplugged: troubles.unplugged, figures, violations };
}

soak('realtime', async (args) => {
  const result = await drive(args.includes('--second') ? SECOND : FIRST);
  return { ok: result.violations.length === 0, ...result };
});
