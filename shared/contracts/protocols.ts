import * as z from 'zod';
import { protocolDocumentSchema } from '../protocol/document';
import { idSchema, instantSchema } from './common';
import { defineRoute } from './route';

export const protocolRevisionSummarySchema = z.strictObject({
  number: z.number().int(),
  issuedAt: instantSchema,
  issuedBy: z.string(),
  note: z.string(),
});
export const protocolSummarySchema = z.strictObject({
  id: idSchema,
  name: z.string(),
  updatedAt: instantSchema,
  updatedBy: z.string(),
  latestRevision: z.number().int().nullable(),
  draftDiffers: z.boolean(),
  stepCount: z.number().int(),
});
export const protocolViewSchema = protocolSummarySchema.extend({
  document: protocolDocumentSchema,
  revisions: z.array(protocolRevisionSummarySchema),
});
export const protocolRevisionSchema = protocolRevisionSummarySchema.extend({
  protocolId: idSchema,
  document: protocolDocumentSchema,
  sha256: z.string(),
});
export type ProtocolSummary = z.infer<typeof protocolSummarySchema>;
export type ProtocolView = z.infer<typeof protocolViewSchema>;
export type ProtocolRevision = z.infer<typeof protocolRevisionSchema>;

const path = '/labs/:labId/protocols/:protocolId';

export const listProtocols = defineRoute({
  name: 'listProtocols',
  summary: 'Protocols of the lab',
  method: 'GET',
  path: '/labs/:labId/protocols',
  access: 'read',
  status: 200,
  response: z.strictObject({ items: z.array(protocolSummarySchema) }),
  problems: ['not-found'],
});
export const createProtocol = defineRoute({
  name: 'createProtocol',
  summary: 'Make a protocol from a document (a template, an import, or nothing yet)',
  method: 'POST',
  path: '/labs/:labId/protocols',
  access: 'protocol.write',
  status: 201,
  idempotent: true,
  body: z.strictObject({ document: protocolDocumentSchema }),
  response: protocolViewSchema,
  problems: ['invalid-input'],
});
export const getProtocol = defineRoute({
  name: 'getProtocol',
  summary: 'The draft and the list of issued revisions',
  method: 'GET',
  path,
  access: 'read',
  status: 200,
  etag: 'reply',
  response: protocolViewSchema,
  problems: ['not-found'],
});
export const saveProtocol = defineRoute({
  name: 'saveProtocol',
  summary: 'Save the draft',
  method: 'PUT',
  path,
  access: 'protocol.write',
  status: 200,
  etag: 'required',
  body: z.strictObject({ document: protocolDocumentSchema }),
  response: protocolViewSchema,
  problems: ['invalid-input', 'not-found', 'edited-meanwhile', 'precondition-required'],
});
export const deleteProtocol = defineRoute({
  name: 'deleteProtocol',
  summary: 'Delete a protocol that was never issued',
  method: 'DELETE',
  path,
  access: 'protocol.write',
  status: 204,
  problems: ['not-found', 'not-possible-now'],
});
export const issueRevision = defineRoute({
  name: 'issueRevision',
  summary: 'Issue the draft as an immutable revision, checked against a rig',
  method: 'POST',
  path: `${path}/revisions`,
  access: 'protocol.write',
  status: 201,
  etag: 'required',
  idempotent: true,
  body: z.strictObject({ rigId: idSchema, note: z.string().max(500).default('') }),
  response: protocolRevisionSchema,
  problems: ['invalid-input', 'not-found', 'protocol-refused', 'not-yet', 'edited-meanwhile', 'precondition-required', 'not-possible-now'],
});
export const getRevision = defineRoute({
  name: 'getRevision',
  summary: 'One issued revision',
  method: 'GET',
  path: `${path}/revisions/:revision`,
  access: 'read',
  status: 200,
  response: protocolRevisionSchema,
  problems: ['not-found'],
});
