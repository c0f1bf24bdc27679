import { and, asc, desc, eq } from 'drizzle-orm';
import { massSets, rigLinks, rigRevisions, rigs } from '@/db/schema';
import type { LinkSettings } from '@/shared/contracts/rigs';
import type { RigDocument } from '@/shared/rig/document';
import { one, type Handle } from './database';

export interface RigRecord {
  labId: string;
  id: string;
  name: string;
  /** Number of the revision that holds now. */
  revision: number;
  document: RigDocument;
  link: LinkSettings;
}

export interface Maker {
  userId: string;
  name: string;
  /** UTC ms. */
  at: number;
}

const rigColumns = {
  labId: rigs.labId,
  id: rigs.id,
  name: rigs.name,
  revision: rigs.revision,
  document: rigRevisions.document,
  link: rigLinks.settings,
};

const rigQuery = (db: Handle) =>
  db
    .select(rigColumns)
    .from(rigs)
    .innerJoin(
      rigRevisions,
      and(eq(rigRevisions.labId, rigs.labId), eq(rigRevisions.rigId, rigs.id), eq(rigRevisions.number, rigs.revision)),
    )
    .innerJoin(rigLinks, and(eq(rigLinks.labId, rigs.labId), eq(rigLinks.rigId, rigs.id)));

/** Rigs of a lab by name. */
export const listRigs = (db: Handle, labId: string): Promise<RigRecord[]> =>
  rigQuery(db).where(eq(rigs.labId, labId)).orderBy(asc(rigs.name), asc(rigs.id));

/** Every rig of every lab: what a starting server drives. */
export const allRigs = (db: Handle): Promise<RigRecord[]> => rigQuery(db).orderBy(asc(rigs.labId), asc(rigs.id));

/** Names of the rigs of a lab by id. */
export async function allRigNames(db: Handle, labId: string): Promise<Map<string, string>> {
  const rows = await db.select({ id: rigs.id, name: rigs.name }).from(rigs).where(eq(rigs.labId, labId));
  return new Map(rows.map(({ id, name }) => [id, name]));
}

export async function findRig(db: Handle, labId: string, rigId: string): Promise<RigRecord | null> {
  const [found] = await rigQuery(db).where(and(eq(rigs.labId, labId), eq(rigs.id, rigId)));
  return found ?? null;
}

/** Adds a rig with its first revision, its link and the mass set its document describes. Returns its id. */
export function createRig(
  db: Handle,
  rig: { labId: string; name: string; document: RigDocument; link: LinkSettings; massSetLabel: string },
  maker: Maker,
): Promise<string> {
  return db.transaction(async (tx) => {
    const row = one(
      await tx.insert(rigs).values({ labId: rig.labId, name: rig.name, revision: 1, createdAt: maker.at }).returning({ id: rigs.id }),
    );
    const key = { labId: rig.labId, rigId: row.id };
    await tx.insert(rigRevisions).values({
      ...key,
      number: 1,
      name: rig.name,
      document: rig.document,
      reason: 'first entry',
      madeAt: maker.at,
      madeById: maker.userId,
      madeBy: maker.name,
    });
    await tx.insert(rigLinks).values({ ...key, settings: rig.link, changedAt: maker.at, changedBy: maker.name });
    await tx.insert(massSets).values({ ...key, label: rig.massSetLabel, sources: rig.document.sources, createdAt: maker.at });
    return row.id;
  });
}

/**
 * Makes a new revision on top of `expectedRevision`.
 * @returns false where the rig is at another revision by now
 */
export function reviseRig(
  db: Handle,
  rig: { labId: string; rigId: string; expectedRevision: number; name: string; document: RigDocument; reason: string },
  maker: Maker,
): Promise<boolean> {
  return db.transaction(async (tx) => {
    const number = rig.expectedRevision + 1;
    const moved = await tx
      .update(rigs)
      .set({ revision: number, name: rig.name })
      .where(and(eq(rigs.labId, rig.labId), eq(rigs.id, rig.rigId), eq(rigs.revision, rig.expectedRevision)))
      .returning({ id: rigs.id });
    if (moved.length === 0) return false;
    await tx.insert(rigRevisions).values({
      labId: rig.labId,
      rigId: rig.rigId,
      number,
      name: rig.name,
      document: rig.document,
      reason: rig.reason,
      madeAt: maker.at,
      madeById: maker.userId,
      madeBy: maker.name,
    });
    return true;
  });
}

/** Revisions of a rig, newest first. */
export const listRigRevisions = (db: Handle, labId: string, rigId: string) =>
  db
    .select()
    .from(rigRevisions)
    .where(and(eq(rigRevisions.labId, labId), eq(rigRevisions.rigId, rigId)))
    .orderBy(desc(rigRevisions.number));

export async function changeRigLink(
  db: Handle,
  link: { labId: string; rigId: string; settings: LinkSettings },
  maker: Maker,
): Promise<void> {
  await db
    .update(rigLinks)
    .set({ settings: link.settings, changedAt: maker.at, changedBy: maker.name })
    .where(and(eq(rigLinks.labId, link.labId), eq(rigLinks.rigId, link.rigId)));
}

export interface MassSetRecord {
  id: string;
  label: string;
  sources: RigDocument['sources'];
}

const massSetColumns = { id: massSets.id, label: massSets.label, sources: massSets.sources };

/** Mass sets of a rig, oldest first. */
export const listMassSets = (db: Handle, labId: string, rigId: string): Promise<MassSetRecord[]> =>
  db
    .select(massSetColumns)
    .from(massSets)
    .where(and(eq(massSets.labId, labId), eq(massSets.rigId, rigId)))
    .orderBy(asc(massSets.createdAt), asc(massSets.label));

export async function findMassSet(db: Handle, rig: { labId: string; rigId: string }, massSetId: string): Promise<MassSetRecord | null> {
  const [found] = await db
    .select(massSetColumns)
    .from(massSets)
    .where(and(eq(massSets.labId, rig.labId), eq(massSets.rigId, rig.rigId), eq(massSets.id, massSetId)));
  return found ?? null;
}

/** Adds a mass set. Null where the rig has one of that label already. */
export async function addMassSet(
  db: Handle,
  massSet: { labId: string; rigId: string; label: string; sources: RigDocument['sources']; createdAt: number },
): Promise<MassSetRecord | null> {
  const [row] = await db
    .insert(massSets)
    .values(massSet)
    .onConflictDoNothing({ target: [massSets.labId, massSets.rigId, massSets.label] })
    .returning(massSetColumns);
  return row ?? null;
}
