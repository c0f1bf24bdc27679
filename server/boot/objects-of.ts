import type { ObjectStore } from '../interfaces/object-store';
import type { ServerConfig } from '../interfaces/server-config';
import { FolderObjects } from './folder-objects';
import { S3Objects } from './s3-objects';

/** Where the configuration says that files are kept. */
export const objectsOf = ({ filesDir, s3 }: Pick<ServerConfig, 'filesDir' | 's3'>): ObjectStore =>
  s3 === null ? new FolderObjects(filesDir) : new S3Objects(s3);

/** Folders that fill. */
export const foldersOf = ({ stateDir, filesDir, s3 }: Pick<ServerConfig, 'stateDir' | 'filesDir' | 's3'>): string[] =>
  s3 === null ? [stateDir, filesDir] : [stateDir];
