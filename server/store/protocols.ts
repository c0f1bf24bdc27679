import { and, asc, desc, eq, max } from 'drizzle-orm';
import { protocolRevisions, protocols, runs } from '@/db/schema';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { one, type Handle } from './database';
import type { Maker } from './rigs';

export type ProtocolRecord = typeof protocols.$inferSelect;
export type RevisionRecord = typeof protocolRevisions.$inferSelect;

/** Protocols of a lab by name, each with its newest revision. */
export async function listProtocols(
  db: Handle,
  labId: string,
): Promise<{ protocol: ProtocolRecord; latest: { number: number; draftVersion: number } | null }[]> {
  const rows = await db.select().from(protocols).where(eq(protocols.labId, labId)).orderBy(asc(protocols.name), asc(protocols.id));
  const latest = await db
    .selectDistinctOn([protocolRevisions.protocolId], {
      protocolId: protocolRevisions.protocolId,
      number: protocolRevisions.number,
      draftVersion: protocolRevisions.draftVersion,
    })
    .from(protocolRevisions)
    .where(eq(protocolRevisions.labId, labId))
    .orderBy(protocolRevisions.protocolId, desc(protocolRevisions.number));
  const byProtocol = new Map(latest.map((revision) => [revision.protocolId, revision]));
  return rows.map((protocol) => ({ protocol, latest: byProtocol.get(protocol.id) ?? null }));
}

export async function findProtocol(db: Handle, labId: string, protocolId: string): Promise<ProtocolRecord | null> {
  const [found] = await db
    .select()
    .from(protocols)
    .where(and(eq(protocols.labId, labId), eq(protocols.id, protocolId)));
  return found ?? null;
}

/** Adds a protocol with its first draft. Returns its id. */
export async function createProtocol(db: Handle, protocol: { labId: string; document: ProtocolDocument }, maker: Maker): Promise<string> {
  const fields = {
    labId: protocol.labId,
    name: protocol.document.name,
    document: protocol.document,
    updatedAt: maker.at,
    updatedById: maker.userId,
    updatedBy: maker.name,
  };
  return one(await db.insert(protocols).values(fields).returning({ id: protocols.id })).id;
}

/**
 * Saves the draft over `expectedVersion`.
 * @returns false where another draft was saved meanwhile
 */
export async function saveDraft(
  db: Handle,
  draft: { labId: string; protocolId: string; expectedVersion: number; document: ProtocolDocument },
  maker: Maker,
): Promise<boolean> {
  const saved = await db
    .update(protocols)
    .set({
      name: draft.document.name,
      document: draft.document,
      version: draft.expectedVersion + 1,
      updatedAt: maker.at,
      updatedById: maker.userId,
      updatedBy: maker.name,
    })
    .where(and(eq(protocols.labId, draft.labId), eq(protocols.id, draft.protocolId), eq(protocols.version, draft.expectedVersion)))
    .returning({ id: protocols.id });
  return saved.length > 0;
}

/** Deletes a protocol without revisions; false where it has one. */
export function deleteProtocol(db: Handle, labId: string, protocolId: string): Promise<boolean> {
  return db.transaction(async (tx) => {
    await tx
      .select({ id: protocols.id })
      .from(protocols)
      .where(and(eq(protocols.labId, labId), eq(protocols.id, protocolId)))
      .for('update');
    const issued = await tx
      .select({ number: protocolRevisions.number })
      .from(protocolRevisions)
      .where(and(eq(protocolRevisions.labId, labId), eq(protocolRevisions.protocolId, protocolId)))
      .limit(1);
    if (issued.length > 0) return false;
    await tx
      .update(runs)
      .set({ protocolId: null })
      .where(and(eq(runs.labId, labId), eq(runs.protocolId, protocolId)));
    await tx.delete(protocols).where(and(eq(protocols.labId, labId), eq(protocols.id, protocolId)));
    return true;
  });
}

/** Revisions of a protocol without their documents, newest first. */
export const listRevisions = (db: Handle, labId: string, protocolId: string) =>
  db
    .select({
      number: protocolRevisions.number,
      issuedAt: protocolRevisions.issuedAt,
      issuedBy: protocolRevisions.issuedBy,
      note: protocolRevisions.note,
      draftVersion: protocolRevisions.draftVersion,
    })
    .from(protocolRevisions)
    .where(and(eq(protocolRevisions.labId, labId), eq(protocolRevisions.protocolId, protocolId)))
    .orderBy(desc(protocolRevisions.number));

export async function findRevision(
  db: Handle,
  protocol: { labId: string; protocolId: string },
  number: number,
): Promise<RevisionRecord | null> {
  const [found] = await db
    .select()
    .from(protocolRevisions)
    .where(
      and(
        eq(protocolRevisions.labId, protocol.labId),
        eq(protocolRevisions.protocolId, protocol.protocolId),
        eq(protocolRevisions.number, number),
      ),
    );
  return found ?? null;
}

export interface NewRevision {
  labId: string;
  protocolId: string;
  /** The draft that was checked; issuing fails where it has changed. */
  draftVersion: number;
  document: ProtocolDocument;
  sha256: string;
  note: string;
  rigId: string;
  rigRevision: number;
}

/** Issues the checked draft as the next revision; null where the draft has changed meanwhile. */
export function issueRevision(db: Handle, revision: NewRevision, maker: Maker): Promise<RevisionRecord | null> {
  return db.transaction(async (tx) => {
    const [draft] = await tx
      .select({ version: protocols.version })
      .from(protocols)
      .where(and(eq(protocols.labId, revision.labId), eq(protocols.id, revision.protocolId)))
      .for('update');
    if (draft?.version !== revision.draftVersion) return null;
    const [last] = await tx
      .select({ number: max(protocolRevisions.number) })
      .from(protocolRevisions)
      .where(and(eq(protocolRevisions.labId, revision.labId), eq(protocolRevisions.protocolId, revision.protocolId)));
    const [row] = await tx
      .insert(protocolRevisions)
      .values({ ...revision, number: (last?.number ?? 0) + 1, issuedAt: maker.at, issuedById: maker.userId, issuedBy: maker.name })
      .returning();
    return row ?? null;
  });
}
