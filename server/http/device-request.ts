import type { Request } from 'express';
import { ProblemError } from './problem-error';

/** What devices send: their token, and bodies that end. */

/** @throws ProblemError without a token */
export function bearerOf(req: Request): string {
  const [, secret = ''] = /^Bearer (\S{20,200})$/.exec(req.get('authorization') ?? '') ?? [];
  if (secret !== '') return secret;
  throw new ProblemError(
    'wrong-token',
    'A device names its token in the header: Authorization: Bearer TOKEN. It is made on the page of the rig.',
  );
}

/**
 * The body, read no further than `most` bytes.
 * @throws what `tooLarge` gives
 */
export async function boundedBody(req: Request, most: number, tooLarge: () => ProblemError): Promise<Buffer> {
  if (Number(req.headers['content-length'] ?? 0) > most) throw tooLarge();
  const parts: Buffer[] = [];
  let bytes = 0;
  for await (const part of req as AsyncIterable<Buffer>) {
    bytes += part.length;
    if (bytes > most) throw tooLarge();
    parts.push(part);
  }
  return Buffer.concat(parts);
}
