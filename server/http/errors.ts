import * as z from 'zod';
import { isDatabaseAway, isGivenUp } from '../store/failures';
import { ProblemError, type ProblemItem } from './problem-error';

const pathOf = (path: readonly PropertyKey[]) => path.map(String).join('.');

/** Problems of a zod check, one item each, by path into `where` (`body`, `query`). */
function itemsOf(error: z.core.$ZodError): ProblemItem[] {
  return error.issues.flatMap((issue) => {
    if (issue.code === 'unrecognized_keys')
      return issue.keys.map((key) => ({ path: pathOf([...issue.path, key]), message: `"${key}" is not known here` }));
    if (issue.code === 'invalid_union') return [nearestBranch(issue)];
    return [{ path: pathOf(issue.path), message: issue.message }];
  });
}

/** Of a union the branch with the fewest complaints says best what is wrong. */
function nearestBranch(issue: z.core.$ZodIssueInvalidUnion): ProblemItem {
  const branch = [...issue.errors].sort((a, b) => a.length - b.length)[0]?.[0];
  return branch === undefined
    ? { path: pathOf(issue.path), message: issue.message }
    : { path: pathOf([...issue.path, ...branch.path]), message: branch.message };
}

/** The refusal of a part of a request that does not fit its schema. */
export function invalidInput(where: 'body' | 'query' | 'document', error: z.core.$ZodError): ProblemError {
  const items = itemsOf(error);
  const first = items[0];
  const place = first === undefined || first.path === '' ? `the ${where}` : `${first.path} in the ${where}`;
  const more = items.length > 1 ? ` (and ${String(items.length - 1)} more)` : '';
  return new ProblemError('invalid-input', `${place}: ${first?.message ?? 'not understood'}${more}.`, items);
}

const bodyErrors: Record<string, () => ProblemError> = {
  'entity.too.large': () => new ProblemError('too-large', 'The body of the request is larger than this route takes.'),
  'entity.parse.failed': () => new ProblemError('invalid-input', 'The body of the request is not JSON.'),
  'encoding.unsupported': () =>
    new ProblemError('wrong-content-type', 'The content encoding of the body is not known; send it plain or with gzip.'),
  'charset.unsupported': () => new ProblemError('wrong-content-type', 'The body must be UTF-8.'),
};

interface ErrorLike {
  type?: unknown;
  status?: unknown;
}
const isErrorLike = (value: unknown): value is ErrorLike => typeof value === 'object' && value !== null;

/** A few seconds. */
const awayRetryS = 5;

const awaySince = (utcMs: number | null) => (utcMs === null ? 'at the moment' : `since ${new Date(utcMs).toISOString().slice(11, 19)} UTC`);

const haltWords = (haltsAnyway: boolean) =>
  haltsAnyway
    ? 'hold and stop still work.'
    : 'hold and stop reach the rigs only through the database: use the switch at the rig if anything must stand still.';

/**
 * Every failure as a problem; what nobody foresaw becomes `internal` and tells nothing of the inside.
 * @param haltsAnyway whether hold and stop work here without the database
 */
export function problemErrorOf(error: unknown, databaseAwaySinceUtcMs: number | null = null, haltsAnyway = true): ProblemError {
  if (error instanceof ProblemError) return error;
  if (isErrorLike(error)) {
    const known = typeof error.type === 'string' ? bodyErrors[error.type] : undefined;
    if (known !== undefined) return known();
    if (isGivenUp(error))
      return new ProblemError(
        'database-away',
        'The database took too long over this request, which was given up. Nothing was changed and nothing stored is lost; hold and stop still work. Try again, and if it happens again ask for less at once, for instance a shorter time.',
      );
    if (isDatabaseAway(error))
      return new ProblemError(
        'database-away',
        `The database does not answer ${awaySince(databaseAwaySinceUtcMs)}. Nothing was changed; ${haltWords(haltsAnyway)} Try again in a few seconds.`,
      ).after(awayRetryS);
    if (error.status === 400) return new ProblemError('invalid-input', 'The address or the body of the request could not be read.');
    if (error.status === 404) return new ProblemError('not-found', 'There is nothing at this address.');
  }
  return new ProblemError(
    'internal',
    'Something unforeseen happened on the server. It was written to its log under the number given as instance.',
  );
}
