import { existsSync, mkdirSync, readdirSync, readFileSync, realpathSync, statSync, writeFileSync } from 'node:fs';
import { dirname, join, relative, sep } from 'node:path';
import { unzipSync, zipSync, type UnzipFileInfo } from 'fflate';
import type { ArchiveFiles } from '@/shared/archive/archive-types';
import { UnusableArchive } from '@/shared/archive/unusable-archive';
import { isInside } from '@/shared/archive/verify-package';

/** Archives as ZIP files and folders. Sizes are bounded, so that a small ZIP cannot fill the memory. */

export interface ArchiveLimits {
  files: number;
  /** Of all files together once unpacked. */
  bytes: number;
  /** Greatest unpacked to packed size of a file over 10 MB. Text of a run packs about tenfold. */
  ratio: number;
}

export const archiveLimits: ArchiveLimits = { files: 20_000, bytes: 2_000_000_000, ratio: 400 };

/**
 * The files of an archive given as a folder or a ZIP.
 * @throws UnusableArchive when there is nothing, or nothing readable, at the path, or it exceeds the limits.
 */
export function readArchiveFiles(path: string, limits: ArchiveLimits = archiveLimits): Map<string, Uint8Array> {
  if (!existsSync(path)) throw new UnusableArchive({ file: null }, `there is no file or folder ${path}`);
  try {
    const about = statSync(path);
    if (about.isDirectory()) return readFolder(path, limits);
    if (about.size > limits.bytes) throw new UnusableArchive({ file: null }, `${path} holds more than ${limits.bytes} bytes`);
    return readZip(readFileSync(path), limits);
  } catch (error) {
    if (!isSystemError(error)) throw error;
    throw new UnusableArchive({ file: null }, `${path} cannot be read: ${error.message}`);
  }
}

const isSystemError = (error: unknown): error is NodeJS.ErrnoException => typeof error === 'object' && error !== null && 'syscall' in error;

/**
 * Unpacks a ZIP. Paths that are absolute or lead out of the archive are refused, and so is a ZIP whose content would
 * exceed the limits. A single folder around everything is taken off.
 */
export function readZip(bytes: Uint8Array, limits: ArchiveLimits = archiveLimits): Map<string, Uint8Array> {
  const entries = unpack(bytes, gate(limits));
  const files = new Map(Object.entries(entries).filter(([path]) => !path.endsWith('/')));
  if (files.has('datapackage.json')) return files;
  const around = [...files.keys()].find((path) => /^[^/]+\/datapackage\.json$/.test(path))?.split('/')[0];
  if (around === undefined || ![...files.keys()].every((path) => path.startsWith(`${around}/`))) return files;
  return new Map([...files].map(([path, content]) => [path.slice(around.length + 1), content]));
}

function unpack(bytes: Uint8Array, filter: (entry: UnzipFileInfo) => boolean): Record<string, Uint8Array> {
  try {
    return unzipSync(bytes, { filter });
  } catch (error) {
    if (error instanceof UnusableArchive) throw error;
    throw new UnusableArchive({ file: null }, `not a readable ZIP: ${(error as Error).message}`);
  }
}

function gate(limits: ArchiveLimits): (entry: UnzipFileInfo) => boolean {
  const seen = new Set<string>();
  let total = 0;
  return (entry) => {
    const path = entry.name.replace(/\/$/, '');
    if (!isInside(path))
      throw new UnusableArchive({ file: null }, `the ZIP holds the path "${entry.name}", which leads out of the archive`);
    if (seen.has(path)) throw new UnusableArchive({ file: null }, `the ZIP holds ${path} twice`);
    seen.add(path);
    total += entry.originalSize;
    if (seen.size > limits.files) throw new UnusableArchive({ file: null }, `the ZIP holds more than ${limits.files} files`);
    if (total > limits.bytes) throw new UnusableArchive({ file: null }, `the ZIP would unpack to more than ${limits.bytes} bytes`);
    if (entry.originalSize > 10_000_000 && entry.originalSize > limits.ratio * entry.size) {
      throw new UnusableArchive(
        { file: null },
        `${path} would unpack to ${entry.originalSize} bytes from ${entry.size}: refused as a ZIP bomb`,
      );
    }
    return true;
  };
}

function readFolder(folder: string, limits: ArchiveLimits): Map<string, Uint8Array> {
  const root = realpathSync(folder);
  const files = new Map<string, Uint8Array>();
  let total = 0;
  for (const path of wantedPaths(root)) {
    const full = join(root, path);
    if (!existsSync(full) || !statSync(full).isFile()) continue;
    const outside = relative(root, realpathSync(full));
    if (outside === '..' || outside.startsWith(`..${sep}`)) throw new UnusableArchive({ file: path }, 'a link leads out of the archive');
    total += statSync(full).size;
    if (total > limits.bytes) throw new UnusableArchive({ file: path }, `the archive holds more than ${limits.bytes} bytes`);
    files.set(path, readFileSync(full));
  }
  return files;
}

/** A folder may hold anything beside the archive, so only what datapackage.json lists and the files of the format are read. */
function wantedPaths(root: string): Set<string> {
  const wanted = new Set(['datapackage.json', 'rig.json', 'protocol.json', 'run.json', 'steps.csv', 'events.jsonl', 'exclusions.csv']);
  const channels = join(root, 'channels');
  if (existsSync(channels) && statSync(channels).isDirectory()) for (const name of readdirSync(channels)) wanted.add(`channels/${name}`);
  const packageFile = join(root, 'datapackage.json');
  if (!existsSync(packageFile)) return wanted;
  for (const path of listedPaths(readFileSync(packageFile, 'utf8'))) if (isInside(path)) wanted.add(path);
  return wanted;
}

/** Paths that a package lists; an unreadable package lists none here and is refused with its reason by the reader. */
function listedPaths(text: string): string[] {
  try {
    const resources = (JSON.parse(text) as { resources?: unknown }).resources;
    return Array.isArray(resources)
      ? resources.map((one) => (one as { path?: unknown } | null)?.path).filter((path) => typeof path === 'string')
      : [];
  } catch {
    return [];
  }
}

/** The archive as one ZIP. The same files give the same bytes: entries carry the earliest date that a ZIP can hold. */
export function zipArchive(files: ArchiveFiles): Uint8Array {
  const entries = Object.fromEntries(
    [...files].map(([path, content]) => [path, typeof content === 'string' ? new TextEncoder().encode(content) : content]),
  );
  return zipSync(entries, { level: 6, mtime: new Date(1980, 0, 1) });
}

/** Writes the archive into a folder, which is made. @throws Error when the folder exists and is not empty. */
export function writeArchiveFolder(files: ArchiveFiles, folder: string): void {
  if (existsSync(folder) && (!statSync(folder).isDirectory() || readdirSync(folder).length > 0)) {
    throw new Error(`${folder} exists and is not an empty folder; name one that does not exist yet`);
  }
  for (const [path, content] of files) {
    const full = join(folder, path);
    mkdirSync(dirname(full), { recursive: true });
    writeFileSync(full, content);
  }
  mkdirSync(folder, { recursive: true });
}
