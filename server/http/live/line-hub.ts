import type { Response } from 'express';
import type { LineMessage } from '@/shared/contracts/link';
import type { SignedIn } from '../route-context';
import { encodeEvent } from './event-stream';
import { Readers, type Reader, type ReadersParts } from './readers';

interface LineReader extends Reader {
  rigId: string;
}

export interface LineHubParts extends Pick<ReadersParts, 'clock' | 'streamsPerUser' | 'mayStillRead'> {
  /** The line of a rig as it is now; null where the rig is not there any more. */
  lineOf(rig: { labId: string; rigId: string }): LineMessage | null;
}

/** All open live streams of lines. Everything they send is in memory, so that they go on while the database is away. */
export class LineHub {
  private readonly readers: Readers<LineReader>;

  constructor(private readonly parts: LineHubParts) {
    this.readers = new Readers({
      ...parts,
      beatMs: 500,
      retryMs: 1000,
      beat: () => {
        for (const reader of [...this.readers]) this.tell(reader);
      },
    });
  }

  open(res: Response, { labId, rigId, me }: { labId: string; rigId: string; me: SignedIn }): void {
    this.tell(this.readers.add(res, { labId, me }, (reader) => ({ ...reader, rigId })));
  }

  /** How many pages follow a line. */
  count(): number {
    return this.readers.size;
  }

  /** Something happened on a rig: everybody who looks at its line is told at once. */
  changed(rigId: string): void {
    for (const reader of [...this.readers]) if (reader.rigId === rigId) this.tell(reader);
  }

  endAccess(ended: { sessionId: string } | { userId: string }): void {
    this.readers.endAccess(ended);
  }

  close(): void {
    this.readers.close();
  }

  private tell(reader: LineReader): void {
    const line = this.parts.lineOf(reader);
    if (line === null) this.readers.end(reader);
    else reader.stream.send(encodeEvent('line', line, null));
  }
}
