/** Kinds of failures of the database, as Node and PostgreSQL name them. */

/** Codes of Node, and of PostgreSQL the classes 08, 53, 57P and 58, and 25P03: it cannot be reached, has hung up or is going away, or its disk fails. */
const awayCode = /^(ECONN\w+|EHOST\w+|ENET\w+|EPIPE|ETIMEDOUT|ENOTFOUND|EAI_AGAIN|ENOENT|08\w{3}|25P03|53\w{3}|57P\d\d|58\w{3})$/;
const awayText =
  /Connection terminated|timeout exceeded when trying to connect|Client has encountered a connection error|Cannot use a pool after calling end/;

/** PostgreSQL gave a statement up: past its time limit (57014), too long behind a lock (55P03), or for the sake of another (class 40). */
const givenUpCode = /^(57014|55P03|40\w{3})$/;

interface ErrorLike {
  code?: unknown;
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

const isFileError = (error: ErrorLike) => error.code === 'ENOENT' && error.syscall !== 'connect';

const saysAway = (error: ErrorLike) =>
  (hasCode(error, awayCode) && !isFileError(error)) || (typeof error.message === 'string' && awayText.test(error.message));

/** Whether a failure says that the database cannot be reached, or is going away. */
export const isDatabaseAway = (error: unknown): boolean => isSomewhere(error, saysAway);

/** Whether the database gave up over a statement that it may well do another time. */
export const isGivenUp = (error: unknown): boolean => isSomewhere(error, (inner) => hasCode(inner, givenUpCode));

/** Whether what was asked of the database may simply be asked again. */
export const isPassing = (error: unknown): boolean => isDatabaseAway(error) || isGivenUp(error);
