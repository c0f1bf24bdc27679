import { and, asc, count, eq } from 'drizzle-orm';
import { runSteps, stepNotes } from '@/db/schema';
import { one, type Handle } from './database';

export type StepNoteRecord = typeof stepNotes.$inferSelect;
export type NewStepNote = Omit<StepNoteRecord, 'id'>;

type OfRun = Pick<StepNoteRecord, 'labId' | 'runId'>;

export async function insertStepNote(db: Handle, note: NewStepNote): Promise<StepNoteRecord> {
  return one(await db.insert(stepNotes).values(note).returning());
}

/** Notes of a run by row, then in the order in which they were written. */
export function stepNotesOf(db: Handle, { labId, runId }: OfRun): Promise<StepNoteRecord[]> {
  return db
    .select()
    .from(stepNotes)
    .where(and(eq(stepNotes.labId, labId), eq(stepNotes.runId, runId)))
    .orderBy(asc(stepNotes.seq), asc(stepNotes.writtenAt), asc(stepNotes.id));
}

export async function countStepNotes(db: Handle, { labId, runId }: OfRun): Promise<number> {
  const [row] = await db
    .select({ notes: count() })
    .from(stepNotes)
    .where(and(eq(stepNotes.labId, labId), eq(stepNotes.runId, runId)));
  return row?.notes ?? 0;
}

export async function hasStep(db: Handle, { labId, runId, seq }: OfRun & { seq: number }): Promise<boolean> {
  const own = and(eq(runSteps.labId, labId), eq(runSteps.runId, runId), eq(runSteps.seq, seq));
  const found = await db.select({ seq: runSteps.seq }).from(runSteps).where(own);
  return found.length > 0;
}
