import * as z from 'zod';
import { protocolDocumentSchema, registeredEvaluationSchema, type ProtocolDocument } from '../protocol/document';
import type { RigDocument } from '../rig/document';
import { calibrated, calibrationFault } from '../statistics/calibration';
import type { ArchiveFiles, ArchiveWarning, Sha256OfBytes } from './archive-types';
import { readArchivedRig } from './archived-rig';
import { channelPath, readChannel, type SampleColumns } from './channel-csv';
import { exclusionsFile, readExclusions, type Exclusion } from './exclusions';
import type { ChannelInfo, StepRow } from './run-records';
import { readSteps, stepsFile } from './step-csv';
import { unprovedDwells } from './unproved-dwells';
import { firstIssue, UnusableArchive } from './unusable-archive';
import { readPackage, verifyFiles, type PackageDescriptor, type ResourceDescriptor } from './verify-package';
import { verifyArchived, verifyEvents, type ArchiveChain } from './verify-events';

/** A channel as the archive describes it; the role is whatever the writer put there, `deflection` the one that counts. */
export interface ArchivedChannel extends Omit<ChannelInfo, 'role'> {
  role: string;
}

/** Samples of one channel: mid-exposure UTC ms and value in the channel's unit, calibrated where the archive has a calibration, in time order. */
export interface ArchivedSeries extends SampleColumns {
  info: ArchivedChannel;
}

/** A verified archive. Channels are read when asked for, so that a night's environment costs nothing to the evaluation. */
export interface Archive {
  rig: RigDocument;
  steps: StepRow[];
  /** The evaluation registered in protocol.json; null where the protocol registers none or is absent. */
  registered: ProtocolDocument['evaluation'] | null;
  /** The protocol, where it is one that this version can read. */
  protocol: ProtocolDocument | null;
  exclusions: Exclusion[];
  chain: ArchiveChain;
  channels: ArchivedChannel[];
  /** @throws UnusableArchive naming the row of the first sample that cannot be read. */
  readChannel(name: string): ArchivedSeries;
  warnings: ArchiveWarning[];
}

/**
 * Verifies and reads an archive: sizes and hashes of all listed files, the event chain, its agreement with run.json and
 * with the `archived` event, then rig, steps, protocol and exclusions.
 * @throws UnusableArchive saying which file and row, and why.
 */
export function readArchive(files: ArchiveFiles, sha256: Sha256OfBytes): Archive {
  const descriptor = readPackage(files);
  const warnings: ArchiveWarning[] = [];
  const inHand = { files, sha256, warnings };
  // The chain comes first: when an event was changed it says which, the file's hash only that one was.
  const verified = verifyEvents(inHand);
  verifyFiles(descriptor, inHand);
  verifyArchived(verified, inHand);
  const rig = readArchivedRig(parseJson(files, 'rig.json'), warnings);
  const stepText = requiredText(files, stepsFile);
  const steps = readSteps(stepText);
  warnings.push(...unprovedDwells(stepText, steps));
  const { protocol, registered } = readProtocol(files, warnings);
  const exclusions = files.has(exclusionsFile) ? readExclusions(requiredText(files, exclusionsFile)) : [];
  const resources = channelResources(descriptor);
  return {
    rig,
    steps,
    protocol,
    registered,
    exclusions,
    chain: { events: verified.events, valid: verified.valid },
    warnings,
    channels: resources.map(({ info }) => info),
    readChannel: (name) => {
      const found = resources.find(({ info }) => info.name === name);
      if (found === undefined)
        throw new UnusableArchive(
          { file: 'datapackage.json' },
          `there is no channel "${name}"; the archive holds ${listOf(resources.map(({ info }) => info.name))}`,
        );
      return calibratedSeries({ info: found.info, ...readChannel(found.path, requiredText(files, found.path)) });
    },
  };
}

function calibratedSeries(series: ArchivedSeries): ArchivedSeries {
  const { calibration } = series.info;
  return calibration === undefined ? series : { ...series, value: series.value.map((reading) => calibrated(calibration, reading)) };
}

export const listOf = (names: readonly string[]) => (names.length === 0 ? 'none' : names.map((name) => `"${name}"`).join(', '));

function requiredText(files: ArchiveFiles, path: string): string {
  const content = files.get(path);
  if (content === undefined) throw new UnusableArchive({ file: path }, 'the file is missing from the archive');
  return typeof content === 'string' ? content : decode(path, content);
}

function decode(path: string, bytes: Uint8Array): string {
  try {
    return new TextDecoder('utf-8', { fatal: true }).decode(bytes);
  } catch {
    throw new UnusableArchive({ file: path }, 'the file is not UTF-8 text');
  }
}

function parseJson(files: ArchiveFiles, path: string): unknown {
  try {
    return JSON.parse(requiredText(files, path).replace(/^\uFEFF/, ''));
  } catch (error) {
    if (error instanceof UnusableArchive) throw error;
    throw new UnusableArchive({ file: path }, `not readable as JSON: ${(error as Error).message}`);
  }
}

/** Only the registered evaluation matters here, so a protocol of a later version is warned of, not refused. */
function readProtocol(files: ArchiveFiles, warnings: ArchiveWarning[]): Pick<Archive, 'protocol' | 'registered'> {
  if (!files.has('protocol.json')) return { protocol: null, registered: null };
  const json = parseJson(files, 'protocol.json');
  const whole = protocolDocumentSchema.safeParse(json);
  if (whole.success) return { protocol: whole.data, registered: whole.data.evaluation ?? null };
  const part = z.looseObject({ evaluation: registeredEvaluationSchema.optional() }).safeParse(json);
  if (!part.success) throw new UnusableArchive({ file: 'protocol.json' }, firstIssue(part.error));
  warnings.push({
    code: 'protocol-unreadable',
    message: `protocol.json is not a protocol that this version knows (${firstIssue(whole.error)}); only its registered evaluation was read`,
  });
  return { protocol: null, registered: part.data.evaluation ?? null };
}

/** What a channel's resource says of it. Only a deflection's unit matters here, so that others may say less, or something else. */
const channelFactsSchema = z.looseObject({
  channel: z.string().min(1).optional().catch(undefined),
  quantity: z.string().catch(''),
  unit: z.string().optional().catch(undefined),
  role: z.string().catch(''),
});

const calibrationSchema = z.strictObject({
  revision: z.number().int().positive(),
  offset: z.number(),
  slope: z.number(),
  uOffset: z.number().nonnegative(),
  uSlope: z.number().nonnegative(),
  covariance: z.number(),
});

/** What is there and cannot be read is no absent one: G would be another. */
function calibrationIn({ path, evenfall }: ResourceDescriptor): Pick<ArchivedChannel, 'calibration'> {
  const found = z.looseObject({ calibration: z.unknown() }).safeParse(evenfall ?? {});
  if (!found.success || found.data.calibration === undefined) return {};
  const parsed = calibrationSchema.safeParse(found.data.calibration);
  const fault = parsed.success ? calibrationFault(parsed.data) : firstIssue(parsed.error);
  if (!parsed.success || fault !== null)
    throw new UnusableArchive({ file: 'datapackage.json' }, `the calibration of the resource ${path} cannot be used: ${fault ?? ''}`);
  return { calibration: parsed.data };
}

function channelResources(descriptor: PackageDescriptor): { path: string; info: ArchivedChannel }[] {
  return descriptor.resources
    .filter(({ path }) => path.startsWith('channels/') && path.endsWith('.csv'))
    .map((resource) => ({ path: resource.path, info: channelInfo(resource) }));
}

function channelInfo(resource: ResourceDescriptor): ArchivedChannel {
  const facts = channelFactsSchema.safeParse(resource.evenfall ?? {});
  const { channel, quantity, unit, role } = facts.success ? facts.data : { quantity: '', role: '' };
  if (role === 'deflection' && unit === undefined)
    throw new UnusableArchive(
      { file: 'datapackage.json' },
      `the resource ${resource.path} must say evenfall: {quantity, unit, role}: unit is missing`,
    );
  const fileName = resource.path.slice('channels/'.length, -'.csv'.length);
  const name = channel !== undefined && channelPath(channel) === resource.path ? channel : fileName;
  return { name, quantity, unit: unit ?? '', role, ...calibrationIn(resource) };
}
