import { Readable } from 'node:stream';
import { pipeline } from 'node:stream/promises';
import * as contracts from '@/shared/contracts/import-files';
import type { ImportView } from '@/shared/contracts/import-files';
import { inTurns } from '@/server/ingest/receive-file';
import * as store from '@/server/store/import-files';
import { findRig } from '@/server/store/rigs';
import { attach, fileWords } from '../attachment';
import { audited } from '../audited';
import { assertRoom, bytesOf, loadImport, loadRun, receivePart, receiveWhole, storedAlready, tooLarge } from '../import-file';
import { isoOf, isoOrNull } from '../maker';
import { notFound, ProblemError } from '../problem-error';
import { mount } from '../route-context';

/** RFC 9530. */
const digestOf = (sha256: string) => `sha-256=:${Buffer.from(sha256, 'hex').toString('base64')}:`;

const viewOf = (file: store.ImportRecord): ImportView => ({
  id: file.id,
  runId: file.runId,
  fileName: file.fileName,
  state: file.state,
  bytes: file.bytes,
  wantedBytes: file.wantedBytes,
  changedAt: isoOrNull(file.changedAt),
  sha256: file.sha256,
  preview: file.preview,
  createdAt: isoOf(file.createdAt),
  createdBy: file.createdBy,
  storedAt: isoOrNull(file.storedAt),
  channelId: file.channelId,
});

export const importFileRoutes = [
  mount(contracts.beginImport, async (context) => {
    const { params, membership, services, body, me } = context;
    const run = await loadRun(services, membership.labId, params.runId);
    const { fileName, bytes = null, changedAt } = body;
    if (bytes !== null && bytes > services.config.limits.importBytes) throw tooLarge(fileName, services);
    await assertRoom(services, fileName, bytes ?? 0);
    const entry = { kind: 'run.file-begun', data: (file: store.ImportRecord) => ({ runId: run.id, importId: file.id, fileName }) };
    const begun = await audited(context, entry, (tx) =>
      store.beginImport(tx, {
        ...{ labId: run.labId, runId: run.id, fileName, wantedBytes: bytes },
        changedAt: changedAt === undefined ? null : Date.parse(changedAt),
        createdAt: services.clock.utcMs(),
        createdBy: me.name,
      }),
    );
    return viewOf(begun);
  }),

  mount(contracts.listImports, async ({ params, membership, services }) => {
    const run = await loadRun(services, membership.labId, params.runId);
    return { items: (await store.importsOfRun(services.database.db, { labId: run.labId, runId: run.id })).map(viewOf) };
  }),

  mount(contracts.getImport, async ({ params, membership, services }) =>
    viewOf(await loadImport(services, membership.labId, params.importId)),
  ),

  mount(contracts.cancelImport, async (context) => {
    const { params, membership, services } = context;
    const file = await loadImport(services, membership.labId, params.importId);
    const entry = { kind: 'run.file-given-up', data: () => ({ runId: file.runId, importId: file.id, fileName: file.fileName }) };
    await audited(context, entry, async (tx) => {
      if (!(await store.forgetImport(tx, { labId: file.labId, importId: file.id }))) throw storedAlready(file);
    });
    return undefined;
  }),

  mount(contracts.putImportContent, async ({ params, membership, services, req }) => {
    const file = await loadImport(services, membership.labId, params.importId);
    if (file.state === 'stored') throw storedAlready(file);
    const bytes = Number(req.headers['content-length'] ?? 0);
    if (bytes > services.config.limits.importBytes) throw tooLarge(file.fileName, services);
    await assertRoom(services, file.fileName, bytes);
    await receiveWhole(services, file, req);
    return viewOf(await loadImport(services, membership.labId, file.id));
  }),

  mount(contracts.patchImportContent, async ({ params, membership, services, query, req }) => {
    const file = await loadImport(services, membership.labId, params.importId);
    await assertRoom(services, file.fileName, file.wantedBytes ?? 0);
    await receivePart(services, file, { offset: query.offset, content: req });
    return viewOf(await loadImport(services, membership.labId, file.id));
  }),

  mount(contracts.getImportOriginal, async ({ params, membership, services, res }) => {
    const file = await loadImport(services, membership.labId, params.importId);
    if (file.sha256 === null) throw new ProblemError('not-possible-now', `${file.fileName} has not come wholly yet.`);
    const [, name = file.fileName, ending = 'csv'] = /^(.*)\.([A-Za-z0-9]{1,8})$/.exec(file.fileName) ?? [];
    attach(res, `${fileWords(name, 'file')}.${ending}`);
    res.type('text/csv').set('Content-Length', String(file.bytes));
    // As it is, so that length and digest are those of the file.
    res.set('Cache-Control', 'no-store, no-transform').set('Content-Digest', digestOf(file.sha256));
    try {
      await pipeline(Readable.from(inTurns(bytesOf(services, file), services.breathe)), res);
    } catch (error) {
      if (!(error instanceof Error && 'code' in error && error.code === 'ERR_STREAM_PREMATURE_CLOSE')) throw error;
    }
    return undefined;
  }),

  mount(contracts.listImportMappings, async ({ params, membership, services }) => {
    const { db } = services.database;
    if ((await findRig(db, membership.labId, params.rigId)) === null) throw notFound('rig');
    const found = await store.mappingsOfRig(db, membership.labId, params.rigId);
    return {
      items: found.map(({ channelName, columns, mapping: { elapsedFrom: _, ...mapping }, usedAt, usedBy }) => ({
        ...{ channelName, columns, mapping, usedBy },
        usedAt: isoOf(usedAt),
      })),
    };
  }),
];
