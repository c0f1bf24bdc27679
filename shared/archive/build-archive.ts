import { CODATA_2022_G } from '@/shared/physics/constants';
import type { EvaluationResult } from '../evaluation/result';
import { UNIT_OF_G } from '../lib/format-number';
import { formatUncertain } from '../lib/format-uncertain';
import type { ProtocolDocument } from '../protocol/document';
import type { RigDocument } from '../rig/document';
import type { Sha256OfBytes } from './archive-types';
import { appendEvent, canonicalJson, emptyChain } from './chain';
import { channelCsv, channelPath } from './channel-csv';
import { citationText, crateMetadata, type DescribedEvaluation, type DescribedRun } from './describe-archive';
import { exclusionsCsv, exclusionsFile, type Exclusion } from './exclusions';
import { frameFiles, framesCsv, framesFile, type ArchivedFrame } from './frames';
import { notesCsv, notesFile, type StepNote } from './notes';
import { readmeFile, readmeText } from './readme-text';
import type { ChainedEvent, ChannelSeries, SimulatedRun, StepRow } from './run-records';
import { stepsCsv, stepsFile } from './step-csv';
import { channelSchema, exclusionsSchema, framesSchema, notesSchema, stepsSchema, type TableSchema } from './table-schema';

export interface ArchiveRunFacts {
  runId: string;
  outcome: 'finished' | 'held' | 'stopped' | 'failed';
  operator: string;
  startedAtUtcMs: number | null;
  endedAtUtcMs: number | null;
  notes: string;
  massSetLabel: string;
  shuffleSeed?: number | undefined;
  simulated: SimulatedRun | null;
}

/** `evaluation.json`: what `evaluate` prints, and who froze it. */
export type FrozenEvaluation = EvaluationResult & {
  frozen: { at: string; by: string; reason: string; software: string | null; channel: string | null };
};

export interface BuildArchiveInput {
  run: ArchiveRunFacts;
  rig: RigDocument;
  protocol: ProtocolDocument;
  steps: readonly StepRow[];
  events: readonly ChainedEvent[];
  channels: readonly ChannelSeries[];
  exclusions?: readonly Exclusion[];
  notes?: readonly StepNote[];
  frames?: readonly ArchivedFrame[];
  evaluation?: FrozenEvaluation | null;
  /** ISO 8601 UTC: when the archive is made. Also the time of the `archived` event, unless the chain already ends in one. */
  createdAt: string;
  /** Name and version of the writer. */
  software: string;
  /** Title for people; the default names the run. */
  title?: string;
  licenses?: readonly { name: string; title?: string; path?: string }[];
}

/**
 * Everything that one run leaves, as the files of a Frictionless Data Package: path to content. The chain is closed
 * with an `archived` event that holds the SHA-256 of rig, protocol, steps and channels, unless it already ends in one.
 */
export function buildArchive(input: BuildArchiveInput, sha256OfBytes: Sha256OfBytes): Map<string, Uint8Array> {
  const sha256 = hashedOnce(sha256OfBytes);
  const recorded = recordedFiles(input);
  const events = closedChain(input, recorded, sha256);
  const files: FileEntry[] = [
    ...recorded,
    jsonFile('run.json', runJson(input.run, events)),
    {
      path: 'events.jsonl',
      bytes: utf8(events.map((event) => `${canonicalJson(event)}\n`).join('')),
      facts: { name: 'events', format: 'jsonl', mediatype: 'application/jsonl' },
    },
  ];
  if (input.exclusions !== undefined)
    files.push(csvFile(exclusionsFile, exclusionsCsv(input.exclusions), { name: 'exclusions', schema: exclusionsSchema }));
  if (input.notes !== undefined) files.push(csvFile(notesFile, notesCsv(input.notes), { name: 'notes', schema: notesSchema }));
  if (input.frames !== undefined) {
    files.push(csvFile(framesFile, framesCsv(input.frames), { name: 'frames', schema: framesSchema }));
    files.push(...frameFiles(input.frames));
  }
  if (input.evaluation) files.push(jsonFile('evaluation.json', input.evaluation));
  files.push(...descriptions(input, files, sha256));
  const archive = new Map(files.map((file) => [file.path, file.bytes]));
  archive.set('datapackage.json', utf8(`${JSON.stringify(dataPackage(input, files, sha256), null, 2)}\n`));
  return archive;
}

/** The hash of a file stands in the chain, in the package and in the crate. */
function hashedOnce(sha256: Sha256OfBytes): Sha256OfBytes {
  const known = new Map<Uint8Array, string>();
  return (content) => {
    if (typeof content === 'string') return sha256(content);
    const hash = known.get(content) ?? sha256(content);
    known.set(content, hash);
    return hash;
  };
}

/** RO-Crate metadata, citation and a text for people, which describe all the other files. */
function descriptions(input: BuildArchiveInput, files: readonly FileEntry[], sha256: Sha256OfBytes): FileEntry[] {
  const { run, createdAt, software } = input;
  const described: DescribedRun = {
    runId: run.runId,
    title: titleOf(input),
    operator: run.operator,
    createdAt,
    startedAt: iso(run.startedAtUtcMs),
    endedAt: iso(run.endedAtUtcMs),
    software,
    licenses: licensesOf(input),
    evaluation: describedEvaluation(input),
  };
  const citation: FileEntry = {
    path: 'CITATION.cff',
    bytes: utf8(citationText(described)),
    facts: { name: 'citation', format: 'cff', mediatype: 'application/yaml', encoding: 'utf-8' },
  };
  const readme: FileEntry = {
    path: readmeFile,
    bytes: utf8(readmeText(described)),
    facts: { name: 'readme', format: 'md', mediatype: 'text/markdown', encoding: 'utf-8' },
  };
  const all = [...files, citation, readme].map(({ path, bytes, facts }) => ({ path, bytes, mediatype: String(facts.mediatype) }));
  return [citation, readme, jsonFile('ro-crate-metadata.json', crateMetadata(described, all, sha256))];
}

function describedEvaluation({ evaluation }: BuildArchiveInput): DescribedEvaluation | null {
  if (evaluation == null) return null;
  const { G, frozen } = evaluation;
  return { ...frozen, result: G === null ? null : formatUncertain({ value: G.value, u: G.u, unit: UNIT_OF_G }) };
}

const iso = (utcMs: number | null) => (utcMs === null ? null : new Date(utcMs).toISOString());
const titleOf = ({ title, run, protocol }: BuildArchiveInput) => title ?? `Run ${run.runId}: ${protocol.name}`;
const licensesOf = ({ licenses }: BuildArchiveInput) => licenses ?? [{ name: 'notspecified', title: 'No licence stated' }];

/** The `data` of the event `archived` for a run's records, for a caller that stores the event itself. */
export function archivedData(
  input: Pick<BuildArchiveInput, 'rig' | 'protocol' | 'steps' | 'channels'>,
  sha256: Sha256OfBytes,
): Record<string, unknown> {
  return hashesOf(recordedFiles(input), sha256);
}

interface FileEntry {
  path: string;
  bytes: Uint8Array;
  /** What the resource says besides path, bytes and hash. */
  facts: Record<string, unknown>;
}

const utf8 = (text: string) => new TextEncoder().encode(text);

const jsonFile = (path: string, value: unknown): FileEntry => ({
  path,
  bytes: utf8(`${JSON.stringify(value, null, 2)}\n`),
  facts: { name: path.replace('.json', ''), format: 'json', mediatype: 'application/json', encoding: 'utf-8' },
});

const csvFile = (path: string, text: string, about: { name: string; schema: TableSchema; evenfall?: unknown }): FileEntry => ({
  path,
  bytes: utf8(text),
  facts: {
    profile: 'tabular-data-resource',
    format: 'csv',
    mediatype: 'text/csv',
    encoding: 'utf-8',
    dialect: { lineTerminator: '\n' },
    ...about,
  },
});

/** Rig, protocol, steps and channels: what the `archived` event seals. */
function recordedFiles({
  rig,
  protocol,
  steps,
  channels,
}: Pick<BuildArchiveInput, 'rig' | 'protocol' | 'steps' | 'channels'>): FileEntry[] {
  return [
    jsonFile('rig.json', rig),
    jsonFile('protocol.json', protocol),
    csvFile(stepsFile, stepsCsv(steps), { name: 'steps', schema: stepsSchema }),
    ...channels.map((series) => {
      const { name, quantity, unit, role, calibration } = series.info;
      return csvFile(channelPath(name), channelCsv(series), {
        name: `channel-${name.toLowerCase().replaceAll(/[^a-z0-9._-]+/g, '-')}`,
        schema: channelSchema(series.info),
        evenfall: { channel: name, quantity, unit, role, ...(calibration === undefined ? {} : { calibration }) },
      });
    }),
  ];
}

const hashesOf = (files: readonly FileEntry[], sha256: Sha256OfBytes) => ({
  files: Object.fromEntries(files.map((file) => [file.path, sha256(file.bytes)])),
});

function closedChain(input: BuildArchiveInput, recorded: readonly FileEntry[], sha256: Sha256OfBytes): ChainedEvent[] {
  const last = input.events.at(-1);
  if (last?.kind === 'archived') return [...input.events];
  return [
    ...input.events,
    appendEvent(last ?? emptyChain, { at: input.createdAt, kind: 'archived', data: hashesOf(recorded, sha256) }, sha256),
  ];
}

function runJson(run: ArchiveRunFacts, events: readonly ChainedEvent[]): Record<string, unknown> {
  return {
    runId: run.runId,
    outcome: run.outcome,
    operator: run.operator,
    startedAt: iso(run.startedAtUtcMs),
    endedAt: iso(run.endedAtUtcMs),
    notes: run.notes,
    massSet: run.massSetLabel,
    events: { count: events.length, head: events.at(-1)?.hash ?? emptyChain.hash },
    ...(run.shuffleSeed === undefined ? {} : { shuffleSeed: run.shuffleSeed }),
    ...(run.simulated === null ? {} : { simulated: run.simulated }),
  };
}

function dataPackage(input: BuildArchiveInput, files: readonly FileEntry[], sha256: Sha256OfBytes): Record<string, unknown> {
  return {
    profile: 'data-package',
    name: `evenfall-run-${input.run.runId.toLowerCase().replaceAll(/[^a-z0-9._-]+/g, '-')}`,
    title: titleOf(input),
    created: input.createdAt,
    licenses: licensesOf(input),
    resources: files.map((file) => ({ ...file.facts, path: file.path, bytes: file.bytes.length, hash: `sha256:${sha256(file.bytes)}` })),
    evenfall: {
      formatVersion: 1,
      runId: input.run.runId,
      software: input.software,
      codata: { name: 'CODATA 2022', ...CODATA_2022_G, unit: 'm3.kg-1.s-2' },
    },
  };
}
