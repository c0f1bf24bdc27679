import type { Response } from 'express';
import type { Cancel, Clock } from '@/server/interfaces/clock';
import { ProblemError } from '../problem-error';
import type { SignedIn } from '../route-context';
import { EventStream } from './event-stream';

/** Somebody who reads an open stream. */
export interface Reader {
  labId: string;
  me: SignedIn;
  stream: EventStream;
}

export interface ReadersParts {
  clock: Clock;
  streamsPerUser: number;
  /** How often there is something to be said, ms. */
  beatMs: number;
  /** How long a browser whose stream broke waits before it comes back, ms. */
  retryMs: number;
  /** Whether the reader may still see this lab. */
  mayStillRead(reader: SignedIn, labId: string): Promise<boolean>;
  /** Says it. */
  beat(): void;
}

const commentEveryMs = 15_000;
const checkEveryMs = 30_000;

/** All who read streams of one kind: who may open one, a beat while anybody reads, and the end of those whose access is over. */
export class Readers<R extends Reader> {
  private readonly open = new Set<R>();
  private beats = 0;
  private cancelBeat: Cancel | null = null;

  constructor(private readonly parts: ReadersParts) {}

  /** Opens a stream on an answer; `make` says what else is kept of its reader. */
  add(res: Response, reader: Omit<Reader, 'stream'>, make: (reader: Reader) => R): R {
    const { streamsPerUser, retryMs } = this.parts;
    const has = [...this.open].filter(({ me }) => me.userId === reader.me.userId).length;
    if (has >= streamsPerUser)
      throw new ProblemError(
        'too-many-requests',
        `You have ${String(has)} live pages open, which is the most there may be. Close one of the others.`,
      );
    const made = make({ ...reader, stream: new EventStream(res) });
    this.open.add(made);
    made.stream.onClosed(() => this.open.delete(made));
    made.stream.retry(retryMs);
    this.keepBeating();
    return made;
  }

  [Symbol.iterator](): IterableIterator<R> {
    return this.open.values();
  }

  get size(): number {
    return this.open.size;
  }

  some(holds: (reader: R) => boolean): boolean {
    for (const reader of this.open) if (holds(reader)) return true;
    return false;
  }

  end(reader: R): void {
    this.open.delete(reader);
    reader.stream.end();
  }

  /** Ends the streams of a session or of an account. */
  endAccess(ended: { sessionId: string } | { userId: string }): void {
    for (const reader of [...this.open]) {
      const meant = 'sessionId' in ended ? reader.me.session.id === ended.sessionId : reader.me.userId === ended.userId;
      if (meant) this.end(reader);
    }
  }

  close(): void {
    for (const reader of [...this.open]) this.end(reader);
    this.cancelBeat?.();
    this.cancelBeat = null;
  }

  private keepBeating(): void {
    if (this.cancelBeat !== null || this.open.size === 0) return;
    const { clock, beatMs, beat } = this.parts;
    this.cancelBeat = clock.after(beatMs, () => {
      this.cancelBeat = null;
      this.beats += 1;
      beat();
      if (this.beats % Math.round(commentEveryMs / beatMs) === 0) for (const { stream } of this.open) stream.comment('still here');
      this.checkSome();
      this.keepBeating();
    });
  }

  /** Each session has its beat in which it is looked at: a thousand pages at once would keep everybody waiting. */
  private checkSome(): void {
    const turns = Math.round(checkEveryMs / this.parts.beatMs);
    const asked = new Map<string, R[]>();
    for (const reader of this.open) {
      const { id } = reader.me.session;
      if (turnOf(id, turns) !== this.beats % turns) continue;
      const key = `${id} ${reader.labId}`;
      asked.set(key, [...(asked.get(key) ?? []), reader]);
    }
    for (const readers of asked.values()) void this.check(readers);
  }

  /** Readers of one session in one lab. */
  private async check(readers: readonly R[]): Promise<void> {
    const [first] = readers;
    if (first === undefined) return;
    try {
      if (!(await this.parts.mayStillRead(first.me, first.labId))) for (const reader of readers) this.end(reader);
    } catch {
      // The database is away: who was let in stays in until it can be asked again.
    }
  }
}

/** A session's identifier is the hash of its token: its digits are spread evenly. */
const turnOf = (sessionId: string, turns: number): number => (Number.parseInt(sessionId.slice(0, 8), 16) || 0) % turns;
