import { and, eq } from 'drizzle-orm';
import { doorCards, labs, rigs } from '@/db/schema';
import type { Handle } from './database';

export interface DoorRecord {
  labId: string;
  rigId: string;
  ring: string;
  madeAt: number;
}

const ofRig = ({ labId, rigId }: { labId: string; rigId: string }) => and(eq(doorCards.labId, labId), eq(doorCards.rigId, rigId));

export async function findDoor(db: Handle, rig: { labId: string; rigId: string }): Promise<DoorRecord | null> {
  const { labId, rigId, ring, madeAt } = doorCards;
  const [row] = await db.select({ labId, rigId, ring, madeAt }).from(doorCards).where(ofRig(rig));
  return row ?? null;
}

export async function putDoor(db: Handle, door: DoorRecord & { tokenHash: string }): Promise<void> {
  const { ring, tokenHash, madeAt } = door;
  await db
    .insert(doorCards)
    .values(door)
    .onConflictDoUpdate({ target: [doorCards.labId, doorCards.rigId], set: { ring, tokenHash, madeAt } });
}

export async function deleteDoor(db: Handle, rig: { labId: string; rigId: string }): Promise<void> {
  await db.delete(doorCards).where(ofRig(rig));
}

export interface DoorAtAddress extends DoorRecord {
  labName: string;
  rigName: string;
  timeZone: string;
}

export async function doorAt(db: Handle, tokenHash: string): Promise<DoorAtAddress | null> {
  const [row] = await db
    .select({
      labId: doorCards.labId,
      rigId: doorCards.rigId,
      ring: doorCards.ring,
      madeAt: doorCards.madeAt,
      labName: labs.name,
      rigName: rigs.name,
      timeZone: labs.timeZone,
    })
    .from(doorCards)
    .innerJoin(labs, eq(labs.id, doorCards.labId))
    .innerJoin(rigs, and(eq(rigs.labId, doorCards.labId), eq(rigs.id, doorCards.rigId)))
    .where(eq(doorCards.tokenHash, tokenHash));
  return row ?? null;
}
