import { problemCodes, type Problem, type ProblemCode } from '@/shared/contracts/problem';

export type ProblemItem = NonNullable<Problem['errors']>[number];

/** A failure with a sentence for people and a stable code for programs; the edge turns it into an RFC 9457 answer. */
export class ProblemError extends Error {
  override readonly name = 'ProblemError';
  /** When it makes sense to try again, s: the header `Retry-After`. */
  retryAfterS?: number;

  /**
   * @param code stable code of `shared/contracts/problem.ts`; decides the HTTP status
   * @param detail what is wrong, where, and what would be right
   * @param errors one entry for each thing that is wrong
   */
  constructor(
    readonly code: ProblemCode,
    readonly detail: string,
    readonly errors?: readonly ProblemItem[],
  ) {
    super(detail);
  }

  /** The same, saying after how many seconds it makes sense to try again. */
  after(seconds: number): this {
    this.retryAfterS = seconds;
    return this;
  }
}

/** Short names of the problems, the same for every occurrence of a code. */
export const problemTitles: Record<ProblemCode, string> = {
  'invalid-input': 'The request is not right',
  'not-signed-in': 'Nobody is signed in',
  'wrong-credentials': 'E-mail or password is wrong',
  'wrong-token': 'The device token does not count',
  'session-expired': 'The session has ended',
  'not-allowed': 'The role may not do this',
  'cross-site': 'The request came from another site',
  'not-found': 'There is no such thing',
  'rig-busy': 'The rig is busy',
  'not-armed': 'The rig is not armed',
  'not-reviewed': 'The review does not count',
  'not-signed': 'The cautions are not signed',
  locked: 'Somebody has hands in the rig',
  'not-ready': 'The rig is not ready',
  'not-possible-now': 'This is not possible now',
  'already-exists': 'This exists already',
  'still-running': 'The first request is still running',
  'edited-meanwhile': 'Somebody else saved meanwhile',
  'too-large': 'Too large',
  'no-room': 'No room on the disk',
  'wrong-content-type': 'The content type is not accepted',
  'protocol-refused': 'The protocol is refused',
  'not-yet': 'This is not built yet',
  'key-reused': 'The key was used for another request',
  'unreadable-data': 'The data cannot be read',
  'cannot-evaluate': 'The run cannot be evaluated',
  'precondition-required': 'The version edited must be named',
  'too-many-requests': 'Too many requests',
  internal: 'Something went wrong here',
  'database-away': 'The database does not answer',
  'files-away': 'The store of files does not answer',
  'rigs-away': 'Nobody who drives the rig answers',
};

/** The RFC 9457 document of a failure. */
export function problemOf(error: ProblemError, instance: string): Problem {
  return {
    type: `/problems/${error.code}`,
    title: problemTitles[error.code],
    status: problemCodes[error.code],
    code: error.code,
    detail: error.detail,
    instance,
    ...(error.errors === undefined ? {} : { errors: [...error.errors] }),
  };
}

export const notFound = (what: string): ProblemError =>
  new ProblemError('not-found', `There is no ${what} with this id in this lab, or it is not yours to see.`);
