import { ApiProblem, ApiUnreachable } from '@/components/api/problem';
import type { ImportView } from '@/shared/contracts/import-files';

/** Sends a file part by part, and goes on where it was cut off for as long as nobody cancels. Knows neither React nor the network. */

const leastPartBytes = 262_144;
const mostPartBytes = 8 * 1_048_576;
export const firstPartBytes = 1_048_576;

/** A part that takes longer than `quickMs` makes the next one smaller, a much quicker one larger: so that progress is seen and little is lost. */
const quickMs = 4000;
const greatestWaitMs = 15_000;

/** How large the next part is, after one of `bytes` that took so long. */
export function nextPartBytes(bytes: number, tookMs: number): number {
  const next = tookMs > quickMs ? bytes / 2 : tookMs < quickMs / 4 ? bytes * 2 : bytes;
  return Math.min(mostPartBytes, Math.max(leastPartBytes, next));
}

/** How long is waited before another try, ms. */
export const waitMs = (failures: number): number => Math.min(greatestWaitMs, 500 * 2 ** Math.min(failures, 10));

export interface UploadProgress {
  bytes: number;
  sent: number;
  /** Why nothing goes on at the moment; null: it does. */
  waiting: string | null;
}

export interface UploadParts {
  file: Blob;
  /** What the server had of it when this began. */
  view: ImportView;
  send: (offset: number, part: Blob, signal: AbortSignal) => Promise<ImportView>;
  /** How much has come. */
  look: (signal: AbortSignal) => Promise<ImportView>;
  tell: (progress: UploadProgress) => void;
  /** Resolves after so many ms, or sooner where the network comes back. */
  wait: (ms: number, signal: AbortSignal) => Promise<void>;
  nowMs: () => number;
  signal: AbortSignal;
}

const passing = new Set(['database-away', 'files-away', 'too-many-requests', 'internal']);

/** Why another try may get through, in words; null: it will not. */
function hopeOf(error: unknown): string | null {
  if (error instanceof ApiUnreachable) return 'The network is away.';
  if (error instanceof ApiProblem) {
    if (passing.has(error.code)) return error.detail;
    // The part was cut off, or an answer was lost and the part had come.
    if (error.errors.some(({ path }) => path === 'offset') && error.code === 'not-possible-now') return 'Looking how much has come.';
    if (error.code === 'invalid-input' && error.errors.length === 0) return 'A part was cut off on its way.';
    return null;
  }
  return isTimeout(error) ? 'The network is very slow.' : null;
}

/** The limit of one part, not the person, broke it off. */
const isTimeout = (error: unknown): boolean => error instanceof DOMException && error.name === 'AbortError';

/**
 * Sends what is missing of a file. Resolves with the file as the server has it whole.
 * @throws {ApiProblem} what no further try would change; the signal's reason where it was cancelled
 */
export async function upload({ file, view, send, look, tell, wait, nowMs, signal }: UploadParts): Promise<ImportView> {
  let now = view;
  let partBytes = firstPartBytes;
  let failures = 0;
  const say = (waiting: string | null) => tell({ bytes: file.size, sent: now.bytes, waiting });
  say(null);
  while (now.state === 'waiting') {
    signal.throwIfAborted();
    const beganMs = nowMs();
    try {
      now = failures === 0 ? await send(now.bytes, file.slice(now.bytes, now.bytes + partBytes), signal) : await look(signal);
      partBytes = failures === 0 ? nextPartBytes(partBytes, nowMs() - beganMs) : partBytes;
      failures = 0;
      say(null);
    } catch (error) {
      signal.throwIfAborted();
      const hope = hopeOf(error);
      if (hope === null) throw error;
      failures += 1;
      partBytes = nextPartBytes(partBytes, Infinity);
      say(hope);
      await wait(waitMs(failures), signal);
    }
  }
  return now;
}
