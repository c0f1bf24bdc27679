import { createHash } from 'node:crypto';
import { buildArchive } from '@/shared/archive/build-archive';
import { readArchive } from '@/shared/archive/read-archive';
import { sha256Hex } from '@/server/evaluation/sha256';
import { smallArchiveInput } from './small-archive';

export const text = (bytes: Uint8Array | undefined) => new TextDecoder().decode(bytes);
export const json = (bytes: Uint8Array | undefined) => JSON.parse(text(bytes)) as Record<string, unknown>;

export type Files = Map<string, Uint8Array | string>;

/** The small archive with one file changed, hashes of the package kept up to date or not. */
export function changed(path: string, change: (content: string) => string, rehash = false): Files {
  const files: Files = new Map(buildArchive(smallArchiveInput(), sha256Hex));
  files.set(path, change(text(files.get(path) as Uint8Array)));
  if (rehash) {
    const descriptor = json(files.get('datapackage.json') as Uint8Array) as { resources: { path: string; bytes: number; hash: string }[] };
    for (const resource of descriptor.resources) {
      const content = Buffer.from(files.get(resource.path) as Uint8Array);
      resource.bytes = content.length;
      resource.hash = `sha256:${createHash('sha256').update(content).digest('hex')}`;
    }
    files.set('datapackage.json', JSON.stringify(descriptor));
  }
  return files;
}

/** Without hashes and without the chain, so that only the content itself can be wrong. */
export function bare(path: string, content: string): Files {
  const files: Files = new Map(buildArchive(smallArchiveInput(), sha256Hex));
  for (const gone of ['events.jsonl', 'run.json']) files.delete(gone);
  const descriptor = json(files.get('datapackage.json') as Uint8Array) as { resources: { path: string; bytes?: number; hash?: string }[] };
  descriptor.resources = descriptor.resources.filter((resource) => files.has(resource.path));
  for (const resource of descriptor.resources) {
    delete resource.bytes;
    delete resource.hash;
  }
  files.set('datapackage.json', JSON.stringify(descriptor));
  files.set(path, content);
  return files;
}

export const read = (files: Files) => readArchive(files, sha256Hex);
