import type { Request } from 'express';
import { ProblemError } from './problem-error';

/** The Link header (RFC 8288) of a page that has a next one, or null. */
export function linkToNext(req: Request, body: unknown): string | null {
  if (typeof body !== 'object' || body === null || !('next' in body) || typeof body.next !== 'string') return null;
  const [path, query] = req.originalUrl.split('?') as [string, string | undefined];
  const search = new URLSearchParams(query);
  search.set('cursor', body.next);
  return `<${path}?${search.toString()}>; rel="next"`;
}

/** A cursor is opaque to callers: base64url of the JSON of the last row's sort key. */
const encodeCursor = (key: readonly (string | number)[]): string => Buffer.from(JSON.stringify(key)).toString('base64url');

/** Sort key out of a cursor; `kinds` names the type of each part. */
export function decodeCursor<const K extends readonly ('string' | 'number')[]>(
  cursor: string | undefined,
  kinds: K,
): { [I in keyof K]: K[I] extends 'number' ? number : string } | null {
  if (cursor === undefined) return null;
  try {
    const key: unknown = JSON.parse(Buffer.from(cursor, 'base64url').toString('utf8'));
    if (Array.isArray(key) && key.length === kinds.length && kinds.every((kind, index) => typeof key[index] === kind)) return key as never;
  } catch {
    // fall through: any unreadable cursor is refused alike
  }
  throw new ProblemError('invalid-input', 'The cursor is not one of ours. Begin without a cursor and follow the Link header.', [
    { path: 'cursor', message: 'take it from the answer before' },
  ]);
}

/** Cuts `rows` (asked for with one row more than `limit`) into a page. */
export function pageFrom<T>(
  rows: readonly T[],
  limit: number,
  keyOf: (row: T) => readonly (string | number)[],
): { items: T[]; next: string | null } {
  const items = rows.slice(0, limit);
  const last = items.at(-1);
  return { items, next: rows.length > limit && last !== undefined ? encodeCursor(keyOf(last)) : null };
}
