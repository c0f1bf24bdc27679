import * as z from 'zod';
import type { ArchiveFiles, ArchiveInHand } from './archive-types';
import { verifyChain } from './chain';
import type { ChainedEvent } from './run-records';
import { sha256In } from './sha256-text';
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
const runSchema = z.looseObject({ events: z.looseObject({ count: z.number().int().optional(), head: z.string().optional() }).optional() });

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
    if (claimed.count !== undefined && claimed.count > 0)
      throw new UnusableArchive({ file: eventsFile }, `the file is missing, although run.json counts ${claimed.count} events`);
    warnings.push({ code: 'no-chain', message: 'The archive holds no events.jsonl: nothing shows that its records are complete.' });
    return { events: 0, valid: null, last: undefined };
  }
  const events = readEvents(textOf(content));
  const check = verifyChain(events, sha256);
  if (!check.valid)
    throw new UnusableArchive({ file: eventsFile, row: check.seq }, `the chain is broken at seq ${check.seq}: ${check.why}`);
  if (claimed.count !== undefined && claimed.count !== check.events) {
    throw new UnusableArchive({ file: runFile }, `events.count is ${claimed.count}, but events.jsonl holds ${check.events} events`);
  }
  if (claimed.head !== undefined && claimed.head.toLowerCase() !== check.head.hash) {
    throw new UnusableArchive({ file: runFile }, `events.head is not the hash of the last event, seq ${check.head.seq}`);
  }
  return { events: check.events, valid: true, last: events.at(-1) };
}

/** What run.json says of the chain. */
function claimedByRun(files: ArchiveFiles): { count?: number | undefined; head?: string | undefined } {
  const content = files.get(runFile);
  if (content === undefined) return {};
  const parsed = runSchema.safeParse(parseLine(textOf(content).replace(/^\uFEFF/, ''), { file: runFile }));
  if (!parsed.success)
    throw new UnusableArchive(
      { file: runFile },
      `${parsed.error.issues[0]?.path.join('.') ?? ''}: ${parsed.error.issues[0]?.message ?? ''}`,
    );
  return parsed.data.events ?? {};
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
    const event = parseLine(line, place);
    const parsed = eventSchema.safeParse(event);
    if (!parsed.success) {
      const issue = parsed.error.issues[0];
      throw new UnusableArchive(place, `seq ${events.length + 1}: ${issue?.path.join('.') ?? ''}: ${issue?.message ?? 'not an event'}`);
    }
    // As written, not as parsed: the schema leaves out a key such as __proto__, which the hash does cover.
    events.push(event as ChainedEvent);
  });
  return events;
}

/**
 * Holds rig, protocol, steps and channels, and whatever else it names, against the SHA-256 in the last event, `archived`.
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
  const { byPath, loose } = archivedHashes(last.data);
  for (const [path, expected] of byPath) {
    const content = files.get(path);
    if (content === undefined) throw new UnusableArchive({ file: path }, 'the file was archived (event "archived") but is missing');
    if (sha256(content) !== expected) throw otherContent(path, last.seq);
  }
  const unsealed = [...files]
    .filter(([path, content]) => isSealed(path) && !byPath.has(path) && !loose.has(sha256(content)))
    .map(([path]) => path);
  const [first] = unsealed;
  if (first === undefined) return;
  if (byPath.size === 0 && loose.size > 0) throw otherContent(first, last.seq);
  warnings.push({
    code: 'no-archived-event',
    message: `The event "archived" holds no SHA-256 of ${unsealed.join(', ')}: nothing ties ${unsealed.length === 1 ? 'it' : 'them'} to the chain.`,
  });
}

const otherContent = (path: string, seq: number) =>
  new UnusableArchive({ file: path }, `the file is not the one that was archived: event seq ${seq} holds another SHA-256`);

/** The files that the event `archived` seals. */
const isSealed = (path: string) => ['rig.json', 'protocol.json', 'steps.csv'].includes(path) || /^channels\/.+\.csv$/.test(path);

/**
 * The SHA-256 in the data of an `archived` event, with or without a leading `sha256:` and however nested: those that stand under the
 * path of a file, and those that do not.
 */
function archivedHashes(data: unknown): { byPath: Map<string, string>; loose: Set<string> } {
  const byPath = new Map<string, string>();
  const loose = new Set<string>();
  const collect = (value: unknown, key: string): void => {
    if (typeof value === 'object' && value !== null) {
      for (const [inner, one] of Object.entries(value)) collect(one, inner);
      return;
    }
    const hash = typeof value === 'string' ? sha256In(value) : null;
    if (hash === null) return;
    if (/\.[a-z0-9]+$/i.test(key)) byPath.set(key, hash);
    else loose.add(hash);
  };
  collect(data, '');
  return { byPath, loose };
}
