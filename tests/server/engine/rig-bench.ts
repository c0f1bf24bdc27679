import { createHash } from 'node:crypto';
import type { RunStart, StepRow, ChainedEvent } from '@/shared/archive/run-records';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { SampleReader } from '@/server/interfaces/sample-reader';
import { type LeftOpen, type RunStore, type RunWrite, StaleRunError, type StoredRun } from '@/server/interfaces/run-store';
import { MemoryJournal } from '@/server/engine/memory-journal';
import { mergeWrites, withAllToPerform } from '@/server/engine/merge-journal';
import { RunDriver } from '@/server/engine/run-driver';
import type { RunDriverParts } from '@/server/engine/run-driver-parts';
import type { Arm, Effect } from '@/server/engine/run-context';
import { VirtualClock } from '@/server/engine/virtual-clock';
import { isPassing } from '@/server/store/failures';
import { FakeLink } from './fake-link';

/** A rig on a fake clock, a store in memory and a driver between them. */

export const startUtcMs = Date.UTC(2026, 2, 1, 22, 0, 0);
export const sha256 = (text: string) => createHash('sha256').update(text).digest('hex');
export const settle = () => new Promise<void>((resolve) => setImmediate(resolve));

/** Home, near, then two reversals of 60 s: some two minutes and a half. */
export const shortProtocol: ProtocolDocument = {
  formatVersion: 1,
  name: 'Short',
  steps: [
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    { kind: 'dwell', for_s: 60 },
    { kind: 'mark', label: 'half way' },
    { kind: 'swing', to: 'far' },
    { kind: 'dwell', for_s: 60 },
  ],
};

export const runStart = (protocol: ProtocolDocument = shortProtocol, more: Partial<RunStart> = {}): RunStart => ({
  labId: 'lab',
  runId: 'run-1',
  rigId: 'north-bench',
  rigName: 'North bench',
  rigRevision: 1,
  protocolName: protocol.name,
  protocolRevision: 1,
  rig: demoRigWide,
  protocol,
  massSetLabel: 'lead',
  timeZone: 'Europe/Oslo',
  operator: 'Ada Quill',
  notes: '',
  arm: { name: 'Ada Quill', untilUtcMs: startUtcMs + 16 * 3_600_000 },
  simulated: null,
  ...more,
});

const databaseAway = () => Object.assign(new Error('the connection broke before the answer'), { code: 'ECONNRESET' });

/** Keeps runs as JSON text, as a database would: what is not plain data is lost. */
export class MemoryStore implements RunStore {
  stored: string | null = null;
  readonly rows = new Map<number, StepRow>();
  readonly events: ChainedEvent[] = [];
  writes = 0;
  /** Asked before each commit: `away` fails, `answer-lost` fails after the write was made, what it throws is the database's refusal. */
  fault: (write: RunWrite) => 'none' | 'away' | 'answer-lost' = () => 'none';

  constructor(private readonly start: RunStart) {}

  async load(): Promise<StoredRun | null> {
    return this.stored === null ? null : (JSON.parse(this.stored) as StoredRun);
  }

  async unfinished(): Promise<StoredRun[]> {
    const run = await this.load();
    return run === null ? [] : [run];
  }

  async leftOpen(): Promise<LeftOpen> {
    return { startedAtUtcMs: null, steps: this.log().filter(({ outcome }) => outcome === null) };
  }

  async commit(write: RunWrite): Promise<void> {
    const fault = this.fault(write);
    if (fault === 'away') throw databaseAway();
    const head = this.events.at(-1);
    if ((head?.seq ?? 0) !== write.expectedSeq) throw new StaleRunError(`the chain ends at ${head?.seq ?? 0}`);
    this.events.push(...(JSON.parse(JSON.stringify(write.events)) as ChainedEvent[]));
    for (const row of JSON.parse(JSON.stringify(write.steps)) as StepRow[]) this.rows.set(row.seq, row);
    const last = this.events.at(-1);
    const chain = last === undefined ? { seq: 0, hash: '0'.repeat(64) } : { seq: last.seq, hash: last.hash };
    this.stored = JSON.stringify({ start: this.start, snapshot: write.snapshot, chartVersion: write.chartVersion, chain });
    this.writes += 1;
    if (fault === 'answer-lost') throw databaseAway();
  }

  log(): StepRow[] {
    return [...this.rows.values()].sort((a, b) => a.seq - b.seq);
  }

  kinds(): string[] {
    return this.events.map(({ kind }) => kind);
  }
}

export interface Bench {
  clock: VirtualClock;
  link: FakeLink;
  store: MemoryStore;
  journal: MemoryJournal;
  driver: RunDriver;
  start: RunStart;
  performed: Effect[];
  /** Errors the driver reported. */
  errors: unknown[];
  arm: { now: Arm | null };
  /** Lets virtual time go by. */
  pass(seconds: number, until?: () => boolean): Promise<void>;
  /** The process is gone; another takes the run up `afterS` later. */
  restart(afterS: number): Promise<void>;
}

export function makeBench(start: RunStart = runStart(), samples?: SampleReader): Bench {
  const clock = new VirtualClock(startUtcMs, settle);
  const link = new FakeLink(clock);
  const store = new MemoryStore(start);
  const journal = new MemoryJournal();
  const performed: Effect[] = [];
  const errors: unknown[] = [];
  const arm = { now: start.arm };
  const parts = (stored: StoredRun | null): RunDriverParts => ({
    start,
    stored,
    ...(samples === undefined ? {} : { samples }),
    store,
    journal,
    link,
    clock,
    sha256,
    armNow: () => arm.now,
    perform: (effect) => performed.push(effect),
    isPassing,
    onError: (error) => errors.push(error),
  });
  const bench: Bench = {
    clock,
    link,
    store,
    journal,
    start,
    performed,
    errors,
    arm,
    driver: new RunDriver(parts(null)),
    pass: (seconds, until) => clock.advance(1000 * seconds, until),
    restart: async (afterS) => {
      bench.driver.close();
      link.forget();
      clock.after(2000, () => link.lapseLease());
      await clock.advance(1000 * afterS);
      const kept = await journal.read();
      if (kept.length > 0) await mergeWrites(store, withAllToPerform(kept));
      await journal.clear();
      bench.driver = new RunDriver(parts(await store.load()));
      bench.driver.recover();
      await clock.advance(0);
    },
  };
  return bench;
}

/** A bench whose run is under way, `seconds` after its start. */
export async function underWay(seconds: number, start: RunStart = runStart()): Promise<Bench> {
  const bench = makeBench(start);
  bench.driver.start();
  await bench.pass(seconds);
  return bench;
}

/** Kind and outcome of each row. */
export const brief = (bench: Bench) => bench.store.log().map(({ kind, outcome }) => `${kind} ${outcome}`);

/** Commands of these kinds that went to the controller. */
export const sent = (bench: Bench, ...kinds: string[]) => bench.link.commands.filter(({ kind }) => kinds.includes(kind));

/** Three reversals there and back at a beat of two periods. */
export const beats: ProtocolDocument = {
  formatVersion: 1,
  name: 'Beats',
  steps: [
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    {
      kind: 'repeat',
      times: 3,
      steps: [
        { kind: 'swing', to: 'far' },
        { kind: 'dwell', beat_periods: 2 },
        { kind: 'swing', to: 'near' },
        { kind: 'dwell', beat_periods: 2 },
      ],
    },
  ],
};
