import { formatInstant } from '../archive/instants';

/** Samples on their way to the server, as a pure function of what happens: nothing is lost while there is room, and what is dropped is told. */

export interface SpotSample {
  utcMs: number;
  mm: number;
}

/** Samples of one channel that follow each other. Ids grow with time and are never used again. */
export interface SpotPiece {
  id: number;
  channel: string;
  samples: readonly SpotSample[];
}

/** Samples that were dropped: how many, and between when. */
export interface Dropped {
  count: number;
  fromUtcMs: number;
  toUtcMs: number;
}

export interface SpotBuffer {
  /** Measured since the last piece was closed. */
  open: SpotPiece | null;
  /** Closed pieces, oldest first. */
  pieces: readonly SpotPiece[];
  /** The batch that was sent and not answered yet: sent again as it is, so that the server knows it. */
  underWay: readonly SpotPiece[] | null;
  /** Of the next piece. */
  nextId: number;
  /** Samples in all three. */
  held: number;
  stored: number;
  dropped: Dropped | null;
}

export type BufferEvent =
  | { type: 'measured'; channel: string; sample: SpotSample }
  /** What a page before this one left, oldest first. */
  | { type: 'found'; pieces: readonly SpotPiece[] }
  /** Make up the next batch of this channel, where none of it is under way. */
  | { type: 'send'; channel: string }
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
const fullPiece = 100;

export const emptyBuffer = (firstId: number): SpotBuffer => ({
  ...{ open: null, pieces: [], underWay: null },
  ...{ nextId: firstId, held: 0, stored: 0, dropped: null },
});

export function bufferAfter(buffer: SpotBuffer, event: BufferEvent, limits: BufferLimits = usualLimits): SpotBuffer {
  switch (event.type) {
    case 'measured':
      return measured(buffer, event, limits);
    case 'found':
      return withinLimits({ ...buffer, pieces: [...event.pieces, ...buffer.pieces], held: buffer.held + countOf(event.pieces) }, limits);
    case 'send':
      return sending(buffer, event.channel, limits);
    case 'stored': {
      const count = countOf(buffer.underWay ?? []);
      return { ...buffer, underWay: null, held: buffer.held - count, stored: buffer.stored + count };
    }
    case 'refused':
      return without({ ...buffer, underWay: null }, buffer.underWay ?? []);
  }
}

/** All that is held, oldest first. */
export const heldPieces = ({ underWay, pieces, open }: SpotBuffer): SpotPiece[] => [
  ...(underWay ?? []),
  ...pieces,
  ...(open === null ? [] : [open]),
];

export const countOf = (pieces: readonly SpotPiece[]): number => pieces.reduce((sum, { samples }) => sum + samples.length, 0);

/** Samples that wait for another channel than this one. */
export const countOfOthers = (buffer: SpotBuffer, channel: string): number =>
  countOf(heldPieces(buffer).filter((piece) => piece.channel !== channel));

function measured(buffer: SpotBuffer, { channel, sample }: { channel: string; sample: SpotSample }, limits: BufferLimits): SpotBuffer {
  const before = withinLimits(buffer, { ...limits, most: limits.most - 1 });
  const { open, pieces, nextId, held } = before;
  const goesOn = open !== null && open.channel === channel;
  const piece = goesOn ? { ...open, samples: [...open.samples, sample] } : { id: nextId, channel, samples: [sample] };
  const isFull = piece.samples.length >= Math.min(limits.batch, fullPiece);
  const closed = [...(open === null || goesOn ? [] : [open]), ...(isFull ? [piece] : [])];
  return {
    ...before,
    open: isFull ? null : piece,
    pieces: closed.length === 0 ? pieces : [...pieces, ...closed],
    nextId: goesOn ? nextId : nextId + 1,
    held: held + 1,
  };
}

/** The oldest pieces go first; what is under way may be stored already and stays. */
function withinLimits(buffer: SpotBuffer, { most }: BufferLimits): SpotBuffer {
  let left = buffer;
  while (left.held > most) {
    const [oldest, ...rest] = left.pieces;
    if (oldest !== undefined) left = without({ ...left, pieces: rest }, [oldest]);
    else if (left.open !== null) left = without({ ...left, open: null }, [left.open]);
    else break;
  }
  return left;
}

function without(buffer: SpotBuffer, lost: readonly SpotPiece[]): SpotBuffer {
  return { ...buffer, held: buffer.held - countOf(lost), dropped: lost.reduce(droppedAfter, buffer.dropped) };
}

function droppedAfter(before: Dropped | null, { samples }: SpotPiece): Dropped | null {
  const [first] = samples;
  const last = samples.at(-1);
  if (first === undefined || last === undefined) return before;
  return {
    count: (before?.count ?? 0) + samples.length,
    fromUtcMs: Math.min(before?.fromUtcMs ?? Infinity, first.utcMs),
    toUtcMs: Math.max(before?.toUtcMs ?? -Infinity, last.utcMs),
  };
}

/** A batch that waits for its answer is sent again, unless it is of another channel than is asked for now. */
function sending(buffer: SpotBuffer, channel: string, limits: BufferLimits): SpotBuffer {
  const { underWay, pieces } = buffer;
  if (underWay === null) return nextBatch(buffer, channel, limits);
  return underWay[0]?.channel === channel
    ? buffer
    : nextBatch({ ...buffer, underWay: null, pieces: [...underWay, ...pieces] }, channel, limits);
}

/** The oldest pieces of the channel, as many as a batch holds. */
function nextBatch(buffer: SpotBuffer, channel: string, { batch }: BufferLimits): SpotBuffer {
  const { open } = buffer;
  const pieces = open === null ? buffer.pieces : [...buffer.pieces, open];
  const taken: SpotPiece[] = [];
  let count = 0;
  for (const piece of pieces) {
    if (piece.channel !== channel) continue;
    if (taken.length > 0 && count + piece.samples.length > batch) break;
    taken.push(piece);
    count += piece.samples.length;
  }
  if (taken.length === 0) return buffer;
  const sent = new Set(taken);
  return { ...buffer, open: null, pieces: pieces.filter((piece) => !sent.has(piece)), underWay: taken };
}

/** The lines of a batch as the server takes them; stamps to the microsecond. */
export function linesOf(batch: readonly SpotPiece[]): string {
  return batch
    .flatMap(({ channel, samples }) =>
      samples.map(({ utcMs, mm }) => JSON.stringify({ channel, time_utc: formatInstant(utcMs), value: mm })),
    )
    .join('\n');
}
