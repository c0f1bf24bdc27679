import * as z from 'zod';
import type { ArchiveFiles, ArchiveInHand } from './archive-types';
import { verifyChain } from './chain';
import type { ChainedEvent } from './run-records';
import { UnusableArchive } from './unusable-archive';

const eventsFile = 'events.jsonl';
const runFile = 'run.json';

export interface ArchiveChain {
  events: number;
  /** Null where the archive holds no chain; a broken one is never read. */
  valid: true | null;
}

const eventSchema = z.looseObject({
  seq: z.number().int(),
  at: z.string(),
  kind: z.string(),
  data: z.record(z.string(), z.unknown()),
  prev: z.string(),
  hash: z.string(),
});
const runSchema = z.looseObject({ events: z.looseObject({ count: z.number().int(), head: z.string() }).optional() });

const textOf = (content: Uint8Array | string) => (typeof content === 'string' ? content : new TextDecoder().decode(content));

/** The chain as found, with its last event for `verifyArchived`. */
export interface VerifiedChain extends ArchiveChain {
  last: ChainedEvent | undefined;
}

/**
 * Follows the event chain and holds it against run.json.
 * @throws UnusableArchive naming the `seq` at which the chain breaks.
 */
export function verifyEvents({ files, sha256, warnings }: ArchiveInHand): VerifiedChain {
  const content = files.get(eventsFile);
  const claimed = claimedByRun(files);
  if (content === undefined) {
    if (claimed !== undefined)
      throw new UnusableArchive({ file: eventsFile }, `the file is missing, although run.json counts ${claimed.count} events`);
    warnings.push({ code: 'no-chain', message: 'The archive holds no events.jsonl: nothing shows that its records are complete.' });
    return { events: 0, valid: null, last: undefined };
  }
  const events = readEvents(textOf(content));
  const check = verifyChain(events, sha256);
  if (!check.valid)
    throw new UnusableArchive({ file: eventsFile, row: check.seq }, `the chain is broken at seq ${check.seq}: ${check.why}`);
  if (claimed !== undefined && claimed.count !== check.events) {
    throw new UnusableArchive({ file: runFile }, `events.count is ${claimed.count}, but events.jsonl holds ${check.events} events`);
  }
  if (claimed !== undefined && claimed.head.toLowerCase() !== check.head.hash) {
    throw new UnusableArchive({ file: runFile }, `events.head is not the hash of the last event, seq ${check.head.seq}`);
  }
  return { events: check.events, valid: true, last: events.at(-1) };
}

function claimedByRun(files: ArchiveFiles): { count: number; head: string } | undefined {
  const content = files.get(runFile);
  if (content === undefined) return undefined;
  const parsed = runSchema.safeParse(parseLine(textOf(content).replace(/^\uFEFF/, ''), { file: runFile }));
  if (!parsed.success)
    throw new UnusableArchive(
      { file: runFile },
      `${parsed.error.issues[0]?.path.join('.') ?? ''}: ${parsed.error.issues[0]?.message ?? ''}`,
    );
  return parsed.data.events;
}

function parseLine(text: string, place: { file: string; row?: number }): unknown {
  try {
    return JSON.parse(text);
  } catch (error) {
    throw new UnusableArchive(place, `not readable as JSON: ${(error as Error).message}`);
  }
}

function readEvents(text: string): ChainedEvent[] {
  const events: ChainedEvent[] = [];
  text.split('\n').forEach((line, index) => {
    if (line.trim() === '') return;
    const place = { file: eventsFile, row: index + 1 };
    const parsed = eventSchema.safeParse(parseLine(line, place));
    if (!parsed.success) {
      const issue = parsed.error.issues[0];
      throw new UnusableArchive(place, `seq ${events.length + 1}: ${issue?.path.join('.') ?? ''}: ${issue?.message ?? 'not an event'}`);
    }
    events.push(parsed.data);
  });
  return events;
}

/**
 * The last event, `archived`, names files with their SHA-256, under `files` or directly, with or without a leading `sha256:`.
 * @throws UnusableArchive naming the file that is not the archived one.
 */
export function verifyArchived({ valid, last }: VerifiedChain, { files, sha256, warnings }: ArchiveInHand): void {
  if (valid === null) return;
  if (last?.kind !== 'archived') {
    warnings.push({
      code: 'no-archived-event',
      message: 'The event chain does not end in "archived": nothing ties the files of the archive to it.',
    });
    return;
  }
  const named = typeof last.data.files === 'object' && last.data.files !== null ? (last.data.files as Record<string, unknown>) : last.data;
  for (const [path, value] of Object.entries(named)) {
    const expected = typeof value === 'string' ? /^(?:sha256:)?([0-9a-fA-F]{64})$/.exec(value)?.[1]?.toLowerCase() : undefined;
    if (expected === undefined) continue;
    const content = files.get(path);
    if (content === undefined) throw new UnusableArchive({ file: path }, 'the file was archived (event "archived") but is missing');
    if (sha256(content) !== expected)
      throw new UnusableArchive({ file: path }, `the file is not the one that was archived: event seq ${last.seq} holds another SHA-256`);
  }
}
