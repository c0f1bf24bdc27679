import * as z from 'zod';
import type { ArchiveFiles, ArchiveInHand } from './archive-types';
import { sha256In } from './sha256-text';
import { UnusableArchive } from './unusable-archive';

const packageFile = 'datapackage.json';

const resourceSchema = z.looseObject({
  path: z.string().min(1),
  bytes: z.number().int().nonnegative().optional(),
  hash: z.string().optional(),
  evenfall: z.unknown().optional(),
});

const packageSchema = z.looseObject({
  resources: z.array(resourceSchema),
  evenfall: z.looseObject({ formatVersion: z.number().optional() }).optional(),
});

export type ResourceDescriptor = z.infer<typeof resourceSchema>;
export type PackageDescriptor = z.infer<typeof packageSchema>;

const asBytes = (content: Uint8Array | string) => (typeof content === 'string' ? new TextEncoder().encode(content) : content);

/** Reads datapackage.json. @throws UnusableArchive when it is missing, not JSON, or of another format version. */
export function readPackage(files: ArchiveFiles): PackageDescriptor {
  const content = files.get(packageFile);
  if (content === undefined) throw new UnusableArchive({ file: packageFile }, 'the file is missing: this is no run archive');
  const parsed = packageSchema.safeParse(parse(content));
  if (!parsed.success) {
    const issue = parsed.error.issues[0];
    throw new UnusableArchive({ file: packageFile }, `${issue?.path.join('.') ?? ''}: ${issue?.message ?? 'not a data package'}`);
  }
  const version = parsed.data.evenfall?.formatVersion;
  if (version !== undefined && version !== 1)
    throw new UnusableArchive({ file: packageFile }, `evenfall.formatVersion is ${version}; this version reads 1`);
  const seen = new Set<string>();
  for (const { path } of parsed.data.resources) {
    if (!isInside(path))
      throw new UnusableArchive({ file: packageFile }, `the resource path "${path}" must be relative and stay inside the archive`);
    if (seen.has(path)) throw new UnusableArchive({ file: packageFile }, `the resource ${path} is listed twice`);
    seen.add(path);
  }
  return parsed.data;
}

/** Whether a path is relative, uses forward slashes and never leaves its folder. */
export function isInside(path: string): boolean {
  return (
    !/^[\\/]|^[A-Za-z][A-Za-z0-9+.-]*:|\\|\u0000/.test(path) &&
    path.split('/').every((part) => part !== '' && part !== '.' && part !== '..')
  );
}

function parse(content: Uint8Array | string): unknown {
  try {
    return JSON.parse(
      (typeof content === 'string' ? content : new TextDecoder('utf-8', { fatal: true }).decode(content)).replace(/^\uFEFF/, ''),
    );
  } catch (error) {
    throw new UnusableArchive({ file: packageFile }, `not readable as JSON: ${(error as Error).message}`);
  }
}

/** Files that are read whether or not datapackage.json lists them. */
const filesRead = ['rig.json', 'steps.csv', 'protocol.json', 'exclusions.csv'];

/** The SHA-256 that a resource states; null where it states none, or a hash of another kind. */
function expectedHash({ path, hash }: ResourceDescriptor): string | null {
  if (hash === undefined) return null;
  const expected = sha256In(hash);
  if (expected === null && /^sha256:/i.test(hash))
    throw new UnusableArchive({ file: path }, `its hash in datapackage.json, "${hash}", is no SHA-256: 64 hexadecimal digits are needed`);
  return expected;
}

/**
 * Holds every listed file against its size and SHA-256; files without them are accepted with the warning `no-hashes`.
 * @throws UnusableArchive naming the file that is missing or was changed.
 */
export function verifyFiles(descriptor: PackageDescriptor, { files, sha256, warnings }: ArchiveInHand): void {
  const unchecked: string[] = [];
  for (const resource of descriptor.resources) {
    const content = files.get(resource.path);
    if (content === undefined)
      throw new UnusableArchive({ file: resource.path }, 'listed in datapackage.json but missing from the archive');
    const bytes = asBytes(content);
    if (resource.bytes !== undefined && resource.bytes !== bytes.length) {
      throw new UnusableArchive(
        { file: resource.path },
        `the file has ${bytes.length} bytes, datapackage.json says ${resource.bytes}: it was changed`,
      );
    }
    const expected = expectedHash(resource);
    if (expected !== null && sha256(bytes) !== expected) {
      throw new UnusableArchive({ file: resource.path }, 'the SHA-256 of the file is not the one in datapackage.json: it was changed');
    }
    if (resource.bytes === undefined || expected === null) unchecked.push(resource.path);
  }
  const listed = new Set(descriptor.resources.map(({ path }) => path));
  unchecked.push(...filesRead.filter((path) => files.has(path) && !listed.has(path)));
  if (unchecked.length > 0) {
    warnings.push({
      code: 'no-hashes',
      message: `datapackage.json gives no size and SHA-256 for ${unchecked.join(', ')}: whether ${unchecked.length === 1 ? 'it was' : 'they were'} changed cannot be told`,
    });
  }
}
