import * as z from 'zod';
import { NotYetError } from '@/shared/lib/not-yet-error';
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

/** Codes by which Node and PostgreSQL (classes 08, 53 and 57P) say that the database cannot be reached or is going away. */
const awayCode = /^(ECONN\w+|EPIPE|ETIMEDOUT|ENOTFOUND|EAI_AGAIN|ENOENT|08\w{3}|53\w{3}|57P\d\d)$/;
const awayText =
  /Connection terminated|timeout exceeded when trying to connect|Client has encountered a connection error|Cannot use a pool after calling end/;

/** PostgreSQL gave a statement up: it took longer than its time limit (57014), or waited too long for a lock (55P03). */
const givenUpCode = /^(57014|55P03)$/;

interface ErrorLike {
  code?: unknown;
  type?: unknown;
  status?: unknown;
  message?: unknown;
  cause?: unknown;
  errors?: unknown;
  syscall?: unknown;
}
const isErrorLike = (value: unknown): value is ErrorLike => typeof value === 'object' && value !== null;

/** Whether a failure, or one inside the wrappers of drivers and mappers, is of a kind. */
function isSomewhere(error: unknown, ofKind: (error: ErrorLike) => boolean): boolean {
  if (!isErrorLike(error)) return false;
  if (ofKind(error) || isSomewhere(error.cause, ofKind)) return true;
  return Array.isArray(error.errors) && error.errors.some((inner) => isSomewhere(inner, ofKind));
}

const hasCode = (error: ErrorLike, codes: RegExp) => typeof error.code === 'string' && codes.test(error.code);
const saysAway = (error: ErrorLike) =>
  (hasCode(error, awayCode) && !isFileError(error)) || (typeof error.message === 'string' && awayText.test(error.message));

/** A few seconds. */
const awayRetryS = 5;

const isFileError = (error: ErrorLike) => error.code === 'ENOENT' && error.syscall !== 'connect';

/** Whether a failure says that the database cannot be reached, or is going away. */
export const isDatabaseAway = (error: unknown): boolean => isSomewhere(error, saysAway);

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
  if (error instanceof NotYetError) return new ProblemError('not-yet', error.message);
  if (isErrorLike(error)) {
    const known = typeof error.type === 'string' ? bodyErrors[error.type] : undefined;
    if (known !== undefined) return known();
    if (isSomewhere(error, (inner) => hasCode(inner, givenUpCode)))
      return new ProblemError(
        'database-away',
        'The database took too long over this request, which was given up. Nothing was changed and nothing stored is lost; hold and stop still work. Try again, and if it happens again ask for less at once, for instance a shorter time.',
      );
    if (isSomewhere(error, saysAway))
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
