import type { RowBatch, SampleBatch } from '../interfaces/sample-store';

/**
 * Samples in PostgreSQL's binary COPY format (documentation of COPY, "Binary Format"): a signature, then for each row the
 * number of fields and each field with its length; timestamptz is the microseconds since 2000-01-01T00:00:00Z as int64,
 * double precision its IEEE 754 bits, both with the highest byte first. Nothing is printed or parsed, so values come
 * back bit for bit.
 */

const signature = Buffer.from('PGCOPY\n\xff\r\n\0', 'latin1');
const headerBytes = signature.length + 8;
/** Field count (2), then length (4) and content (8) of each of two fields. */
const rowBytes = 26;
const keyBytes = 16;
const rowsAPiece = 8192;
const postgresEpochUs = 946_684_800_000_000;

export const microsecondsOf = (utcMs: number): number => Math.round(utcMs * 1000);

/** Pieces of the COPY stream of a batch; `keys` are UUIDs that every row begins with. */
export function* encodeSamples({ utcMs, value }: SampleBatch, keys: readonly string[] = []): Generator<Buffer> {
  yield Buffer.concat([signature, Buffer.alloc(8)]);
  const head = rowHead(keys);
  const wholeBytes = head.length + rowBytes - 2;
  for (let from = 0; from < utcMs.length; from += rowsAPiece) {
    const count = Math.min(rowsAPiece, utcMs.length - from);
    const piece = Buffer.alloc(count * wholeBytes);
    for (let row = 0; row < count; row += 1) {
      piece.set(head, row * wholeBytes);
      const at = row * wholeBytes + head.length;
      piece.writeInt32BE(8, at);
      writeInt64(piece, microsecondsOf(utcMs[from + row] as number) - postgresEpochUs, at + 4);
      piece.writeInt32BE(8, at + 12);
      piece.writeDoubleBE(value[from + row] as number, at + 16);
    }
    yield piece;
  }
  yield Buffer.from([0xff, 0xff]);
}

const stagedBytes = 2 + 3 * 12;

/** Pieces of the COPY stream of (bigint, timestamptz, double precision): row, instant, value. */
export function* encodeRows({ row, utcMs, value }: RowBatch): Generator<Buffer> {
  yield Buffer.concat([signature, Buffer.alloc(8)]);
  for (let from = 0; from < utcMs.length; from += rowsAPiece) {
    const count = Math.min(rowsAPiece, utcMs.length - from);
    const piece = Buffer.alloc(count * stagedBytes);
    for (let index = 0; index < count; index += 1) {
      const at = index * stagedBytes;
      piece.writeInt16BE(3, at);
      piece.writeInt32BE(8, at + 2);
      writeInt64(piece, row[from + index] as number, at + 6);
      piece.writeInt32BE(8, at + 14);
      writeInt64(piece, microsecondsOf(utcMs[from + index] as number) - postgresEpochUs, at + 18);
      piece.writeInt32BE(8, at + 26);
      piece.writeDoubleBE(value[from + index] as number, at + 30);
    }
    yield piece;
  }
  yield Buffer.from([0xff, 0xff]);
}

/** Field count and key fields. */
function rowHead(keys: readonly string[]): Buffer {
  const head = Buffer.alloc(2 + keys.length * (4 + keyBytes));
  head.writeInt16BE(keys.length + 2, 0);
  for (const [index, key] of keys.entries()) {
    const at = 2 + index * (4 + keyBytes);
    head.writeInt32BE(keyBytes, at);
    head.write(key.replaceAll('-', ''), at + 4, 'hex');
  }
  return head;
}

/** Two 32-bit halves are several times faster than BigInt; whole microseconds of our age fit a double exactly. */
function writeInt64(target: Buffer, value: number, at: number): void {
  const high = Math.floor(value / 4_294_967_296);
  target.writeInt32BE(high, at);
  target.writeUInt32BE(value - high * 4_294_967_296, at + 4);
}

const readInt64 = (source: Buffer, at: number): number => source.readInt32BE(at) * 4_294_967_296 + source.readUInt32BE(at + 4);

/** The batch in a COPY stream of (timestamptz, double precision), in the stream's order. */
export async function decodeSamples(stream: AsyncIterable<Buffer>): Promise<SampleBatch> {
  const growing = { utcMs: new Float64Array(1024), value: new Float64Array(1024), count: 0 };
  let rest: Buffer = Buffer.alloc(0);
  let inHeader = true;
  for await (const chunk of stream) {
    const data = rest.length === 0 ? chunk : Buffer.concat([rest, chunk]);
    let at = 0;
    if (inHeader) {
      if (data.length < headerBytes) {
        rest = data;
        continue;
      }
      inHeader = false;
      at = headerBytes;
    }
    for (; at + rowBytes <= data.length; at += rowBytes)
      push(growing, (readInt64(data, at + 6) + postgresEpochUs) / 1000, data.readDoubleBE(at + 18));
    rest = data.subarray(at);
  }
  return { utcMs: growing.utcMs.slice(0, growing.count), value: growing.value.slice(0, growing.count) };
}

function push(growing: { utcMs: Float64Array; value: Float64Array; count: number }, utcMs: number, value: number): void {
  if (growing.count === growing.utcMs.length) {
    growing.utcMs = grown(growing.utcMs);
    growing.value = grown(growing.value);
  }
  growing.utcMs[growing.count] = utcMs;
  growing.value[growing.count] = value;
  growing.count += 1;
}

function grown(array: Float64Array): Float64Array {
  const larger = new Float64Array(array.length * 2);
  larger.set(array);
  return larger;
}
