import { rigDocumentSchema, type Quantity, type RigDocument } from '../rig/document';
import type { ArchiveWarning } from './archive-types';
import { firstIssue, UnusableArchive } from './unusable-archive';

const file = 'rig.json';

/**
 * The rig of an archive. It need not be one that could be run: an incomplete `motion` is left out. Keys that this version does not
 * know are left out with the warning `rig-unknown-key`, so that a misspelt one is seen and one of another writer does no harm.
 * @throws UnusableArchive naming the field that is missing, in another unit, or cannot be what it says.
 */
export function readArchivedRig(json: unknown, warnings: ArchiveWarning[]): RigDocument {
  const copy: unknown = structuredClone(json);
  const unknownKeys = takeOutUnknown(copy);
  if (unknownKeys.length > 0) {
    warnings.push({
      code: 'rig-unknown-key',
      message: `rig.json holds ${unknownKeys.join(', ')}, which this version does not know and left out.`,
    });
  }
  if (isRecord(copy) && !rigDocumentSchema.shape.motion.safeParse(copy.motion).success) delete copy.motion;
  const parsed = rigDocumentSchema.safeParse(copy);
  if (!parsed.success) throw new UnusableArchive({ file }, firstIssue(parsed.error));
  assertPossible(parsed.data);
  return parsed.data;
}

const isRecord = (value: unknown): value is Record<string, unknown> => typeof value === 'object' && value !== null && !Array.isArray(value);

/** Deletes the keys that the rig document does not have and returns their paths. */
function takeOutUnknown(rig: unknown): string[] {
  const parsed = rigDocumentSchema.safeParse(rig);
  if (parsed.success) return [];
  return parsed.error.issues.flatMap((issue) => {
    if (issue.code !== 'unrecognized_keys') return [];
    const node = issue.path.reduce<unknown>((inner, key) => (inner as Record<PropertyKey, unknown>)[key], rig) as Record<string, unknown>;
    return issue.keys.map((key) => {
      delete node[key];
      return [...issue.path, key].join('.');
    });
  });
}

/** Masses, lengths and times that no apparatus has would still give a number for G. */
function assertPossible({ pendulum, sources, lever, measured }: RigDocument): void {
  const positive: Record<string, Quantity | undefined> = {
    'pendulum.arm': pendulum.arm,
    'pendulum.ballMass': pendulum.ballMass,
    ...(sources.shape === 'none' ? {} : { 'sources.mass': sources.mass, 'sources.orbit': sources.orbit }),
    'lever.distance': lever?.distance,
    'measured.period_s': measured?.period_s,
    'measured.decayTime_s': measured?.decayTime_s,
  };
  const notNegative: Record<string, Quantity | undefined> = {
    'pendulum.ballRadius': pendulum.ballRadius,
    'pendulum.beamMass': pendulum.beamMass,
    'pendulum.beamLength': pendulum.beamLength,
    'pendulum.extraInertia': pendulum.extraInertia,
    'sources.radius': sources.radius,
  };
  const refuse = (path: string, { value, unit }: Quantity, needed: string): never => {
    throw new UnusableArchive({ file }, `${path} is ${value} ${unit}; ${needed} is needed`);
  };
  for (const [path, one] of Object.entries(positive)) if (one !== undefined && one.value <= 0) refuse(path, one, 'a positive value');
  for (const [path, one] of Object.entries(notNegative))
    if (one !== undefined && one.value < 0) refuse(path, one, 'zero or a positive value');
}
