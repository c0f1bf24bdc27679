import * as z from 'zod';
import { idSchema, instantSchema } from './common';
import { importMappingSchema, importPath, importPreviewSchema } from './data';
import { defineRoute } from './route';

export const importViewSchema = z.strictObject({
  id: idSchema,
  runId: idSchema,
  fileName: z.string(),
  state: z.enum(['waiting', 'received', 'stored', 'refused']),
  /** So much has come. */
  bytes: z.number().int(),
  /** How long the file is that comes in parts; null where it comes at once. */
  wantedBytes: z.number().int().nullable(),
  /** When the file was changed last, by the clock of the device that sends it. */
  changedAt: instantSchema.nullable(),
  /** SHA-256 (hex) of the file as it is kept; null while it comes. */
  sha256: z.string().nullable(),
  preview: importPreviewSchema.nullable(),
  createdAt: instantSchema,
  createdBy: z.string(),
  storedAt: instantSchema.nullable(),
  /** The channel that it was stored in. */
  channelId: idSchema.nullable(),
});
export type ImportView = z.infer<typeof importViewSchema>;

export const beginImport = defineRoute({
  name: 'beginImport',
  summary: 'Begin the import of a deflection file for a run',
  method: 'POST',
  path: '/labs/:labId/runs/:runId/imports',
  access: 'data.import',
  status: 201,
  idempotent: true,
  body: z.strictObject({
    fileName: z.string().min(1).max(255),
    /** Length of a file that is to come in parts. */
    bytes: z.number().int().nonnegative().optional(),
    changedAt: instantSchema.optional(),
  }),
  response: importViewSchema,
  problems: ['invalid-input', 'not-found', 'too-large', 'no-room'],
});
export const listImports = defineRoute({
  name: 'listImports',
  summary: 'Files of a run: those that were stored, and those that have come in part or were not stored yet; the newest 100',
  method: 'GET',
  path: '/labs/:labId/runs/:runId/imports',
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(importViewSchema) }),
  problems: ['not-found'],
});
export const getImport = defineRoute({
  name: 'getImport',
  summary: 'A file and how much of it has come',
  method: 'GET',
  path: importPath,
  access: 'read',
  status: 200,
  response: importViewSchema,
  problems: ['not-found'],
});
export const cancelImport = defineRoute({
  name: 'cancelImport',
  summary: 'Throw away a file that was not stored, or what has come of it',
  method: 'DELETE',
  path: importPath,
  access: 'data.import',
  status: 204,
  problems: ['not-found', 'not-possible-now'],
});
export const patchImportContent = defineRoute({
  name: 'patchImportContent',
  summary: 'Send the next part of a file, 8 MiB at most; after the last one the answer shows its first rows and a guessed mapping',
  method: 'PATCH',
  path: `${importPath}/content`,
  access: 'data.import',
  status: 200,
  consumes: 'text/csv',
  /** Where in the file the part begins: as much as has come. A part that was cut off counts as not sent; an empty one at the end tries again to finish. */
  query: z.strictObject({ offset: z.coerce.number().int().min(0) }),
  response: importViewSchema,
  problems: [
    'invalid-input',
    'not-found',
    'too-large',
    'wrong-content-type',
    'unreadable-data',
    'not-possible-now',
    'files-away',
    'no-room',
  ],
});
export const getImportOriginal = defineRoute({
  name: 'getImportOriginal',
  summary: 'The file byte for byte as it was sent, with its SHA-256 (RFC 9530)',
  method: 'GET',
  path: `${importPath}/original`,
  access: 'read',
  status: 200,
  produces: 'text/csv',
  problems: ['not-found', 'not-possible-now', 'unreadable-data', 'files-away'],
});
const rememberedMappingSchema = z.strictObject({
  channelName: z.string(),
  /** Names of the columns of the file that was stored last. */
  columns: z.array(z.string()),
  mapping: importMappingSchema.omit({ elapsedFrom: true }),
  usedAt: instantSchema,
  usedBy: z.string(),
});
export type RememberedMapping = z.infer<typeof rememberedMappingSchema>;
export const listImportMappings = defineRoute({
  name: 'listImportMappings',
  summary: 'How files were read into the channels of a rig, the last used first',
  method: 'GET',
  path: '/labs/:labId/rigs/:rigId/import-mappings',
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(rememberedMappingSchema) }),
  problems: ['not-found'],
});
export const putImportContent = defineRoute({
  name: 'putImportContent',
  summary: 'Send the whole file at once; the answer shows its first rows and a guessed mapping',
  method: 'PUT',
  path: `${importPath}/content`,
  access: 'data.import',
  status: 200,
  consumes: 'text/csv',
  response: importViewSchema,
  problems: ['not-found', 'too-large', 'wrong-content-type', 'unreadable-data', 'not-possible-now', 'files-away', 'no-room'],
});
