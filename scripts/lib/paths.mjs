import { createHash } from 'node:crypto';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';

export const root = dirname(dirname(dirname(fileURLToPath(import.meta.url))));
export const state = join(root, '.state');

/** A folder outside the project, one for each place the project lies in. */
export const outside = join(tmpdir(), `evenfall-${createHash('sha256').update(root).digest('hex').slice(0, 12)}`);
