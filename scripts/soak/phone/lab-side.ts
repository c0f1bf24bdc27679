import type { Response as ExpressResponse } from 'express';
import { assertFreshTap } from '@/server/http/begin-run';
import { LiveHub } from '@/server/http/live/live-hub';
import { ProblemError } from '@/server/http/problem-error';
import type { SignedIn } from '@/server/http/route-context';
import type { ChainedEvent } from '@/shared/archive/run-records';
import { liveMessageSchemas, type LiveMessages, type RunState, type RunView } from '@/shared/contracts/runs';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { VirtualTime } from './virtual-time';

const protocol: ProtocolDocument = { formatVersion: 1, name: 'Night', steps: [{ kind: 'home' }, { kind: 'dwell', for_s: 3600 }] };
const run = { labId: 'lab-1', runId: 'run-1', rigId: 'rig-1' };
const me = { userId: 'user-1', session: { id: '00000001' } } as SignedIn;
const iso = (utcMs: number) => new Date(utcMs).toISOString();

export interface Answer {
  status: number;
  body: unknown;
}

/** A run as the server tells of it: its acts count once for each key and for 5 s, its streams are the product's own, its controller takes a moment to stand still. */
export class LabSide {
  private state: RunState = 'held';
  private intervention: RunView['intervention'] = null;
  private readonly events: ChainedEvent[] = [];
  private readonly answers = new Map<string, Answer>();
  private readonly hub: LiveHub;
  /** When motion was let begin, and when the controller stood still, ms UTC. */
  readonly resumedAtMs: number[] = [];
  readonly stopsActedOn: number[] = [];
  stoodStillAtMs: number | null = null;
  private readonly startedAtMs: number;

  constructor(
    private readonly time: VirtualTime,
    private readonly random: () => number,
  ) {
    this.startedAtMs = time.utcMs();
    const source = {
      view: async () => this.view(),
      events: async (_: unknown, { afterSeq, limit }: { afterSeq: number; limit: number }) =>
        this.events.filter(({ seq }) => seq > afterSeq).slice(0, limit),
      steps: async () => [],
      beat: () => ({ link: 'ready' as const, lastReplyAt: null, angleDeg: 0, lockedBy: null }),
      mayStillRead: async () => true,
    };
    this.hub = new LiveHub({ source, clock: time, streamsPerUser: 6 });
    this.tell('held');
    this.goOn();
  }

  /** Something is told of the run every now and then. */
  private goOn(): void {
    this.time.after(200 + this.random() * 1500, () => {
      this.tell('mark');
      this.goOn();
    });
  }

  private tell(kind: string): void {
    const seq = this.events.length + 1;
    const event: ChainedEvent = { seq, at: iso(this.time.utcMs()), kind, data: {}, prev: '', hash: '' };
    this.events.push(event);
    this.hub.changed(run.runId, { events: [event], steps: [], progress: progressOf(this.view()) });
  }

  private view(): RunView {
    const over = this.state === 'stopped';
    return {
      ...{ id: run.runId, rigId: run.rigId, rigName: 'North bench', protocolId: 'p-1', protocolName: 'Night', protocolRevision: 1 },
      ...{ state: this.state, rehearsal: false, operator: 'Ilse Marrowby', notes: '', massSetLabel: 'lead', reason: '' },
      createdAt: iso(this.startedAtMs),
      startedAt: iso(this.startedAtMs),
      endedAt: over ? iso(this.stoodStillAtMs ?? 0) : null,
      predictedEndAt: iso(this.startedAtMs + 3_600_000),
      ...{ current: null, deadlineAt: null, dwellsDone: 0, dwellsGood: 0, dwellsPlanned: 1, position: null },
      ...{ holdAfterDwell: false, finishing: null, waiting: null, reversal: null, intervention: this.intervention },
      mayResume: { ok: this.state === 'held', why: '' },
      maySkip: { ok: false, why: '', seq: null },
      lastSeq: this.events.length,
      quarantine: null,
      ...{ rig: demoRigWide, protocol, simulated: null },
    };
  }

  /** Follows the run from the event after `lastEventId`; `send` gets the stream as it is written. Returns its end. */
  follow(lastEventId: number | null, send: (text: string) => void): () => void {
    const closed: (() => void)[] = [];
    const res = {
      ...{ writableEnded: false, destroyed: false, writableLength: 0 },
      removeHeader: () => undefined,
      flushHeaders: () => undefined,
      status: () => res,
      set: () => res,
      write: (bytes: string | Uint8Array) => send(typeof bytes === 'string' ? bytes : Buffer.from(bytes).toString()),
      once: (_: string, listener: () => void) => closed.push(listener),
      end: () => undefined,
    };
    void this.hub.open(res as unknown as ExpressResponse, { run, me, lastEventId });
    return () => closed.forEach((listener) => listener());
  }

  /** What the server answers; the same key gets the same answer. */
  answer(act: 'resume' | 'stop' | 'view', { key, tappedAt }: { key: string; tappedAt: string }): Answer {
    if (act === 'view') return { status: 200, body: this.view() };
    const known = this.answers.get(key);
    if (known !== undefined) return known;
    const given = act === 'stop' ? this.stop() : this.resume(tappedAt);
    this.answers.set(key, given);
    return given;
  }

  private stop(): Answer {
    const serverAt = iso(this.time.utcMs());
    if (this.state !== 'held' && this.state !== 'running') return { status: 202, body: { runId: run.runId, serverAt } };
    this.stopsActedOn.push(this.time.utcMs());
    this.state = 'stopping';
    this.intervention = { kind: 'stop', by: 'Ilse Marrowby', serverAt, confirmedAt: null };
    this.tell('stop-requested');
    this.time.after(50 + this.random() * 4000, () => {
      this.stoodStillAtMs = this.time.utcMs();
      this.state = 'stopped';
      this.intervention = { kind: 'stop', by: 'Ilse Marrowby', serverAt, confirmedAt: iso(this.stoodStillAtMs) };
      this.tell('stopped');
    });
    return { status: 202, body: { runId: run.runId, serverAt } };
  }

  private resume(tappedAt: string): Answer {
    const serverAt = iso(this.time.utcMs());
    try {
      assertFreshTap(tappedAt, this.time.utcMs(), 'resume');
    } catch (error) {
      if (!(error instanceof ProblemError)) throw error;
      const { code, message } = error;
      return { status: 409, body: { type: `/problems/${code}`, title: code, status: 409, code, detail: message } };
    }
    this.resumedAtMs.push(this.time.utcMs());
    this.state = 'running';
    this.intervention = { kind: 'resume', by: 'Ilse Marrowby', serverAt, confirmedAt: serverAt };
    this.tell('resumed');
    return { status: 202, body: { runId: run.runId, serverAt } };
  }
}

const progressNames = Object.keys(liveMessageSchemas.progress.shape) as (keyof LiveMessages['progress'])[];
const progressOf = (view: RunView) => Object.fromEntries(progressNames.map((name) => [name, view[name]])) as LiveMessages['progress'];
