import type { Response } from 'express';
import type { ChainedEvent, StepRow } from '@/shared/archive/run-records';
import type { LiveMessages, RunView } from '@/shared/contracts/runs';
import type { Clock } from '@/server/interfaces/clock';
import type { LiveChange } from '@/server/interfaces/process-post';
import type { SignedIn } from '../route-context';
import { once } from '../once';
import { encodeEvent } from './event-stream';
import { type Reader, Readers } from './readers';
import { RecentChanges } from './recent-changes';

export interface LiveRunKey {
  labId: string;
  runId: string;
  rigId: string;
}

export type LiveSamples = LiveMessages['samples'];

export interface LiveSource {
  view(run: LiveRunKey): Promise<RunView | null>;
  /** Events after `afterSeq`, oldest first, at most `limit`. */
  events(run: LiveRunKey, page: { afterSeq: number; limit: number }): Promise<ChainedEvent[]>;
  /** The rows of the step log with these numbers. */
  steps(run: LiveRunKey, seqs: readonly number[]): Promise<StepRow[]>;
  beat(run: LiveRunKey): Omit<LiveMessages['beat'], 'serverAt'>;
  /** Whether the reader may still see this lab. */
  mayStillRead(reader: SignedIn, labId: string): Promise<boolean>;
}

interface Snapshot {
  lastSeq: number;
  encoded: Buffer;
}

interface RunReader extends Reader {
  run: LiveRunKey;
  /** Changes that came while the gap was being filled; null once it is. */
  waiting: LiveChange[] | null;
  /** Last event sent. */
  sentSeq: number;
}

/** A longer gap is answered by a snapshot. */
const longestGap = 1000;

/** All open live streams of this process: filled from the database, then fed by what the engine saves. */
export class LiveHub {
  private readonly readers: Readers<RunReader>;
  /** Since the last beat, by rig. */
  private readonly samples = new Map<string, LiveSamples[]>();
  private readonly recent = new RecentChanges();
  /** By run, what the next reader is shown first; until something changes, or the next beat. */
  private readonly snapshots = new Map<string, Promise<Snapshot | null>>();

  constructor(private readonly parts: { source: LiveSource; clock: Clock; streamsPerUser: number }) {
    this.readers = new Readers({
      ...{ clock: parts.clock, streamsPerUser: parts.streamsPerUser },
      beatMs: 1000,
      retryMs: 2000,
      mayStillRead: (reader, labId) => parts.source.mayStillRead(reader, labId),
      beat: () => this.beat(),
    });
  }

  /**
   * Opens a stream on an answer. After `lastEventId` nothing of the chain is missed: the gap is filled from the database,
   * or, where it is too long, answered by a snapshot alone.
   */
  async open(res: Response, stream: { run: LiveRunKey; me: SignedIn; lastEventId: number | null }): Promise<void> {
    const { run, me, lastEventId } = stream;
    const reader = this.readers.add(res, { labId: run.labId, me }, (made) => ({ ...made, run, waiting: [], sentSeq: lastEventId ?? 0 }));
    try {
      await this.fill(reader, lastEventId);
    } catch (error) {
      // Headers are out: ending the stream makes the browser come back and ask again.
      this.readers.end(reader);
      throw error;
    }
  }

  /** How many pages follow a run. */
  count(): number {
    return this.readers.size;
  }

  /** Sends what was just saved to everybody who follows the run. */
  changed(runId: string, change: LiveChange): void {
    this.recent.add(runId, change);
    this.snapshots.delete(runId);
    const whole = once(() => Buffer.from(encodeChange(change)));
    for (const reader of this.readers) {
      if (reader.run.runId !== runId) continue;
      if (reader.waiting === null) sendChange(reader, change, whole);
      else reader.waiting.push(change);
    }
  }

  /** Keeps new samples of a rig for the next beat. */
  sampled(rigId: string, samples: LiveSamples): void {
    if (!this.readers.some(({ run }) => run.rigId === rigId)) return;
    this.samples.set(rigId, [...(this.samples.get(rigId) ?? []), samples]);
  }

  endAccess(ended: { sessionId: string } | { userId: string }): void {
    this.readers.endAccess(ended);
  }

  /** Changes may have been missed: every page comes back and is filled from the database. */
  reopen(): void {
    this.recent.clear();
    this.snapshots.clear();
    this.readers.close();
  }

  close(): void {
    this.readers.close();
  }

  private async fill(reader: RunReader, lastEventId: number | null): Promise<void> {
    const snapshot = await this.snapshotOf(reader.run);
    if (snapshot === null) {
      this.readers.end(reader);
      return;
    }
    const { lastSeq, encoded } = snapshot;
    if (lastEventId !== null && lastEventId <= lastSeq) await this.fillGap(reader, { afterSeq: lastEventId, lastSeq });
    reader.stream.send(encoded);
    reader.sentSeq = Math.max(lastEventId !== null && lastEventId > lastSeq ? 0 : reader.sentSeq, lastSeq);
    const waiting = reader.waiting ?? [];
    reader.waiting = null;
    for (const change of waiting) sendChange(reader, change);
  }

  /** The view of a run and, with it, the server's time: how long a step still takes must not wait for the next second to be right. */
  private snapshotOf(run: LiveRunKey): Promise<Snapshot | null> {
    const known = this.snapshots.get(run.runId);
    if (known !== undefined) return known;
    const made = this.madeSnapshot(run);
    this.snapshots.set(run.runId, made);
    made.catch(() => this.snapshots.delete(run.runId));
    return made;
  }

  private async madeSnapshot(run: LiveRunKey): Promise<Snapshot | null> {
    const view = await this.parts.source.view(run);
    if (view === null) return null;
    const { lastSeq } = view;
    return { lastSeq, encoded: Buffer.from(encodeEvent('snapshot', view, lastSeq) + this.encodedBeat(run)) };
  }

  /** Events, then the rows of the step log they speak of: the page may have seen these rows unfinished. */
  private async fillGap(reader: RunReader, gap: { afterSeq: number; lastSeq: number }): Promise<void> {
    const kept = this.recent.between(reader.run.runId, gap);
    if (kept !== null) {
      for (const change of kept) sendGap(reader, change);
      return;
    }
    const { source } = this.parts;
    const events = await source.events(reader.run, { afterSeq: gap.afterSeq, limit: longestGap + 1 });
    if (events.length > longestGap) return;
    const touched = new Set(events.map((event) => event.data.seq).filter((seq) => typeof seq === 'number'));
    sendGap(reader, { events, steps: touched.size === 0 ? [] : await source.steps(reader.run, [...touched]) });
  }

  private beat(): void {
    this.snapshots.clear();
    const texts = new Map<string, Buffer>();
    for (const reader of this.readers) {
      const text = texts.get(reader.run.runId) ?? this.beatOf(reader.run);
      texts.set(reader.run.runId, text);
      reader.stream.send(text);
    }
    this.samples.clear();
  }

  /** What all who follow the run are told. */
  private beatOf(run: LiveRunKey): Buffer {
    const samples = joined(this.samples.get(run.rigId) ?? []).map((batch) => encodeEvent('samples', batch, null));
    return Buffer.from(samples.join('') + this.encodedBeat(run));
  }

  private encodedBeat(run: LiveRunKey): string {
    const { source, clock } = this.parts;
    return encodeEvent('beat', { serverAt: new Date(clock.utcMs()).toISOString(), ...source.beat(run) }, null);
  }
}

function sendChange(reader: RunReader, change: LiveChange, whole = () => Buffer.from(encodeChange(change))): void {
  const { events, steps, progress } = change;
  const fresh = events.filter(({ seq }) => seq > reader.sentSeq);
  reader.sentSeq = Math.max(reader.sentSeq, ...fresh.map(({ seq }) => seq));
  const progressIsNews = progress.lastSeq >= reader.sentSeq;
  if (fresh.length === events.length && progressIsNews) reader.stream.send(whole());
  else reader.stream.send(encodeChange({ events: fresh, steps, progress: progressIsNews ? progress : null }));
}

/** What came while the page was away. */
function sendGap(reader: RunReader, { events, steps }: Omit<LiveChange, 'progress'>): void {
  reader.stream.send(encodeChange({ events, steps, progress: null }));
  reader.sentSeq = events.at(-1)?.seq ?? reader.sentSeq;
}

function encodeChange({ events, steps, progress }: Omit<LiveChange, 'progress'> & { progress: LiveChange['progress'] | null }): string {
  return [
    ...events.map((event) => encodeEvent('event', event, event.seq)),
    ...steps.map((step) => encodeEvent('step', step, null)),
    progress === null ? '' : encodeEvent('progress', progress, progress.lastSeq),
  ].join('');
}

/** Batches of one channel as one message. */
function joined(batches: readonly LiveSamples[]): LiveSamples[] {
  const byChannel = new Map<string, LiveSamples>();
  for (const batch of batches) {
    const before = byChannel.get(batch.channelId);
    byChannel.set(
      batch.channelId,
      before === undefined ? batch : { ...before, utcMs: [...before.utcMs, ...batch.utcMs], value: [...before.value, ...batch.value] },
    );
  }
  return [...byChannel.values()];
}
