import { createHash } from 'node:crypto';
import { SpoiltObjectError, type ObjectFacts } from '../interfaces/object-store';

/** The same pieces, the last of them once all is known to be what was put. @throws SpoiltObjectError */
export async function* unspoilt(
  pieces: AsyncIterable<Uint8Array>,
  { name, bytes, sha256 }: ObjectFacts & { name: string },
): AsyncGenerator<Uint8Array> {
  const hash = createHash('sha256');
  let length = 0;
  let last: Uint8Array | null = null;
  for await (const piece of pieces) {
    if (last !== null) yield last;
    hash.update(piece);
    length += piece.length;
    last = piece;
  }
  if (length !== bytes || hash.digest('hex') !== sha256) throw new SpoiltObjectError(name);
  if (last !== null) yield last;
}
