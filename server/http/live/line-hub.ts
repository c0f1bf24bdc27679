import type { Response } from 'express';
import type { LineMessage } from '@/shared/contracts/link';
import type { Cancel, Clock } from '@/server/interfaces/clock';
import { ProblemError } from '../problem-error';
import type { SignedIn } from '../route-context';
import { encodeEvent, EventStream } from './event-stream';

interface Reader {
  labId: string;
  rigId: string;
  me: SignedIn;
  stream: EventStream;
}

const beatMs = 500;
const retryMs = 1000;
const commentEveryBeats = 30;
const checkEveryBeats = 60;

export interface LineHubParts {
  clock: Clock;
  /** The line of a rig as it is now; null where the rig is not there any more. */
  lineOf(rig: { labId: string; rigId: string }): LineMessage | null;
  /** Whether the reader may still see this lab. */
  mayStillRead(reader: SignedIn, labId: string): Promise<boolean>;
  streamsPerUser: number;
}

/** All open live streams of lines. Everything they send is in memory, so that they go on while the database is away. */
export class LineHub {
  private readonly readers = new Set<Reader>();
  private beats = 0;
  private cancelBeat: Cancel | null = null;

  constructor(private readonly parts: LineHubParts) {}

  open(res: Response, { labId, rigId, me }: Omit<Reader, 'stream'>): void {
    const open = [...this.readers].filter((reader) => reader.me.userId === me.userId).length;
    if (open >= this.parts.streamsPerUser)
      throw new ProblemError(
        'too-many-requests',
        `You have ${String(open)} live pages of lines open, which is the most there may be. Close one of them.`,
      );
    const reader: Reader = { labId, rigId, me, stream: new EventStream(res) };
    this.readers.add(reader);
    reader.stream.onClosed(() => this.readers.delete(reader));
    reader.stream.retry(retryMs);
    this.tell(reader);
    this.keepBeating();
  }

  /** How many pages follow a line. */
  count(): number {
    return this.readers.size;
  }

  /** Something happened on a rig: everybody who looks at its line is told at once. */
  changed(rigId: string): void {
    for (const reader of this.readers) if (reader.rigId === rigId) this.tell(reader);
  }

  /** Ends the streams of a session or of an account. */
  endAccess(ended: { sessionId: string } | { userId: string }): void {
    for (const reader of [...this.readers]) {
      const meant = 'sessionId' in ended ? reader.me.session.id === ended.sessionId : reader.me.userId === ended.userId;
      if (meant) this.end(reader);
    }
  }

  close(): void {
    for (const reader of [...this.readers]) this.end(reader);
    this.cancelBeat?.();
    this.cancelBeat = null;
  }

  private tell(reader: Reader): void {
    const line = this.parts.lineOf(reader);
    if (line === null) this.end(reader);
    else reader.stream.send(encodeEvent('line', line, null));
  }

  private keepBeating(): void {
    if (this.cancelBeat !== null || this.readers.size === 0) return;
    this.cancelBeat = this.parts.clock.after(beatMs, () => {
      this.cancelBeat = null;
      this.beats += 1;
      for (const reader of [...this.readers]) {
        this.tell(reader);
        if (this.beats % commentEveryBeats === 0) reader.stream.comment('still here');
        if (this.beats % checkEveryBeats === 0) void this.check(reader);
      }
      this.keepBeating();
    });
  }

  private async check(reader: Reader): Promise<void> {
    try {
      if (!(await this.parts.mayStillRead(reader.me, reader.labId))) this.end(reader);
    } catch {
      // The database is away: who was let in stays in until it can be asked again.
    }
  }

  private end(reader: Reader): void {
    this.readers.delete(reader);
    reader.stream.end();
  }
}
