import { createHash } from 'node:crypto';

/** A file that is larger than allowed; the stream was left unread from there on. */
export class FileTooLarge extends Error {
  constructor(readonly limitBytes: number) {
    super(`the file is larger than ${String(limitBytes)} bytes`);
  }
}

const headBytes = 65_536;

/** Watches a file pass by: its size against a limit, its SHA-256, its first 64 KiB. */
export class FileWatch {
  private readonly hash = createHash('sha256');
  private readonly headParts: Uint8Array[] = [];
  private headLength = 0;
  private length = 0;

  constructor(private readonly limitBytes: number) {}

  /** @throws FileTooLarge as soon as the limit is passed */
  async *watch(chunks: AsyncIterable<Uint8Array>): AsyncGenerator<Uint8Array> {
    for await (const chunk of chunks) {
      this.length += chunk.length;
      if (this.length > this.limitBytes) throw new FileTooLarge(this.limitBytes);
      this.hash.update(chunk);
      if (this.headLength < headBytes) {
        const part = chunk.subarray(0, headBytes - this.headLength);
        this.headParts.push(part);
        this.headLength += part.length;
      }
      yield chunk;
    }
  }

  get bytes(): number {
    return this.length;
  }

  /** Lower-case hex, once the file has passed. */
  sha256(): string {
    return this.hash.copy().digest('hex');
  }

  head(): Uint8Array {
    return Buffer.concat(this.headParts);
  }
}

/** The same bytes in parts of at most 64 KiB with a turn for everything else after each. */
export async function* inTurns(chunks: AsyncIterable<Uint8Array>, breathe: () => Promise<void>): AsyncGenerator<Uint8Array> {
  for await (const chunk of chunks) {
    for (let from = 0; from < chunk.length; from += headBytes) {
      yield chunk.subarray(from, from + headBytes);
      await breathe();
    }
  }
}

const pieceBytes = 1_048_576;

/** The same bytes in pieces of 1 MiB, the last one shorter. */
export async function* inPieces(chunks: AsyncIterable<Uint8Array>): AsyncGenerator<Buffer> {
  let pending: Uint8Array[] = [];
  let length = 0;
  for await (const chunk of chunks)
    for (let from = 0; from < chunk.length;) {
      const part = chunk.subarray(from, from + pieceBytes - length);
      pending.push(part);
      length += part.length;
      from += part.length;
      if (length < pieceBytes) continue;
      yield Buffer.concat(pending);
      [pending, length] = [[], 0];
    }
  if (length > 0) yield Buffer.concat(pending);
}

/** Lets all of it pass, with a turn for everything else after each piece. */
export async function readAll(chunks: AsyncIterable<Uint8Array>, breathe?: () => Promise<void>): Promise<void> {
  const pieces = chunks[Symbol.asyncIterator]();
  while ((await pieces.next()).done !== true) await breathe?.();
}
