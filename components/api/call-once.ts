import type { RouteContract } from '@/shared/contracts/route';
import { call, type CallInput, type CallResult } from './client';
import { ApiUnreachable, Unanswered } from './problem';

/** What lets masses move counts for 5 s after the tap: whoever tapped must still be looking. */
const countsForMs = 5000;

/**
 * Calls a route that lets masses move. It is sent once, never again by itself, and never waits for a connection.
 * @throws {ApiProblem} the server refused; @throws {Unanswered} no answer came in time, so nobody here knows what became of it
 */
export async function callOnce<R extends RouteContract>(route: R, input: CallInput<R>): Promise<CallResult<R>> {
  const abort = new AbortController();
  const timer = setTimeout(() => abort.abort(), countsForMs);
  try {
    return await call(route, { ...input, signal: abort.signal });
  } catch (error) {
    if (abort.signal.aborted || error instanceof ApiUnreachable) throw new Unanswered();
    throw error;
  } finally {
    clearTimeout(timer);
  }
}
