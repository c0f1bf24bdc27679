import { formatInstant } from '../archive/instants';

/** Samples on their way to the server, as a pure function of what happens: nothing is lost while there is room, and what is dropped is told. */

export interface SpotSample {
  utcMs: number;
  mm: number;
}

/** Samples that were dropped: how many, and between when. */
export interface Dropped {
  count: number;
  fromUtcMs: number;
  toUtcMs: number;
}

export interface SpotBuffer {
  /** Measured since the last piece was closed. */
  open: readonly SpotSample[];
  /** Closed pieces, oldest first. */
  pieces: readonly (readonly SpotSample[])[];
  /** The batch that was sent and not answered yet: sent again as it is, so that the server knows it. */
  underWay: readonly SpotSample[] | null;
  /** Samples in all three. */
  held: number;
  stored: number;
  dropped: Dropped | null;
}

export type BufferEvent =
  | { type: 'measured'; sample: SpotSample }
  /** Make up the next batch, where none is under way. */
  | { type: 'send' }
  /** The batch under way lies in the database. */
  | { type: 'stored' }
  /** It will never be taken: the server said so. */
  | { type: 'refused' };

export interface BufferLimits {
  /** Samples held at most. */
  most: number;
  /** Samples in a batch at most. */
  batch: number;
}

/** Twelve hours at 10 samples a second, some 20 MB; a batch of which 60 a minute stay below what a device may send. */
export const usualLimits: BufferLimits = { most: 432_000, batch: 1000 };

export const emptyBuffer: SpotBuffer = { open: [], pieces: [], underWay: null, held: 0, stored: 0, dropped: null };

export function bufferAfter(buffer: SpotBuffer, event: BufferEvent, limits: BufferLimits = usualLimits): SpotBuffer {
  switch (event.type) {
    case 'measured':
      return measured(buffer, event.sample, limits);
    case 'send':
      return buffer.underWay === null ? nextBatch(buffer, limits) : buffer;
    case 'stored': {
      const count = buffer.underWay?.length ?? 0;
      return { ...buffer, underWay: null, held: buffer.held - count, stored: buffer.stored + count };
    }
    case 'refused': {
      const lost = buffer.underWay ?? [];
      return { ...buffer, underWay: null, held: buffer.held - lost.length, dropped: droppedAfter(buffer.dropped, lost) };
    }
  }
}

function measured(buffer: SpotBuffer, sample: SpotSample, limits: BufferLimits): SpotBuffer {
  const room = buffer.held < limits.most ? buffer : withRoom(buffer);
  const open = [...room.open, sample];
  const full = open.length >= Math.min(limits.batch, 100);
  return { ...room, open: full ? [] : open, pieces: full ? [...room.pieces, open] : room.pieces, held: room.held + 1 };
}

/** The oldest go first; what is under way may be stored already and stays. */
function withRoom(buffer: SpotBuffer): SpotBuffer {
  const [oldest, ...rest] = buffer.pieces.length > 0 ? buffer.pieces : [buffer.open];
  const lost = oldest ?? [];
  const without = buffer.pieces.length > 0 ? { pieces: rest } : { open: [] };
  return { ...buffer, ...without, held: buffer.held - lost.length, dropped: droppedAfter(buffer.dropped, lost) };
}

function droppedAfter(before: Dropped | null, lost: readonly SpotSample[]): Dropped | null {
  const [first] = lost;
  const last = lost.at(-1);
  if (first === undefined || last === undefined) return before;
  return {
    count: (before?.count ?? 0) + lost.length,
    fromUtcMs: Math.min(before?.fromUtcMs ?? Infinity, first.utcMs),
    toUtcMs: Math.max(before?.toUtcMs ?? -Infinity, last.utcMs),
  };
}

function nextBatch(buffer: SpotBuffer, { batch }: BufferLimits): SpotBuffer {
  const pieces = buffer.open.length > 0 ? [...buffer.pieces, buffer.open] : buffer.pieces;
  const taken: SpotSample[] = [];
  let used = 0;
  for (const piece of pieces) {
    if (used > 0 && taken.length + piece.length > batch) break;
    taken.push(...piece);
    used += 1;
  }
  return used === 0 ? buffer : { ...buffer, open: [], pieces: pieces.slice(used), underWay: taken };
}

/** The lines of a batch as the server takes them; stamps to the microsecond. */
export function linesOf(channel: string, batch: readonly SpotSample[]): string {
  return batch.map(({ utcMs, mm }) => JSON.stringify({ channel, time_utc: formatInstant(utcMs), value: mm })).join('\n');
}
