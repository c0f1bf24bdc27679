import type { Problem, ProblemCode } from '@/shared/contracts/problem';

/** The server answered with an RFC 9457 problem: programs branch on `code`, people read `detail`. */
export class ApiProblem extends Error {
  readonly code: ProblemCode;
  readonly status: number;
  readonly detail: string;
  readonly errors: NonNullable<Problem['errors']>;

  constructor(problem: Problem) {
    super(problem.detail);
    this.name = 'ApiProblem';
    this.code = problem.code;
    this.status = problem.status;
    this.detail = problem.detail;
    this.errors = problem.errors ?? [];
  }
}

/** The server did not answer at all. Whether the request arrived is unknown. */
export class ApiUnreachable extends Error {
  constructor() {
    super('The server cannot be reached.');
    this.name = 'ApiUnreachable';
  }
}

/** An act that counts for 5 s and is sent once had no answer: the request may have been lost, or its answer. */
export class Unanswered extends Error {
  constructor() {
    super(
      'No answer came. It counts for 5 s and was not sent again; whether the server got it in time shows in the state of the run. Look there before you try once more.',
    );
    this.name = 'Unanswered';
  }
}

export interface ProblemWords {
  detail: string;
  errors: readonly { path: string; message: string }[];
}

/** Any failure of a request in words for the screen. */
export function wordsOf(error: unknown): ProblemWords {
  if (error instanceof ApiProblem) return { detail: error.detail, errors: error.errors };
  if (error instanceof Unanswered) return { detail: error.message, errors: [] };
  if (error instanceof ApiUnreachable)
    return { detail: 'The server cannot be reached. Nothing you typed is lost; try again when the connection is back.', errors: [] };
  return { detail: 'Something went wrong in this page. Reload it; if it happens again, tell the keeper of the lab.', errors: [] };
}

/** Whether the failure has this code. */
export const isProblem = (error: unknown, code: ProblemCode): error is ApiProblem => error instanceof ApiProblem && error.code === code;

/** Messages by field for a form: the first message of each path. */
export function fieldErrors(error: unknown): Record<string, string> {
  const found: Record<string, string> = {};
  if (error instanceof ApiProblem) for (const { path, message } of error.errors) found[path.replace(/^(body\.|\/)/, '')] ??= message;
  return found;
}
