import { and, eq, isNotNull, isNull, lte } from 'drizzle-orm';
import { rigQuestions } from '@/db/schema';
import type { RigQuestion, RigReply } from '../interfaces/process-post';
import type { Handle } from './database';

interface Key {
  labId: string;
  id: string;
}

const byKey = ({ labId, id }: Key) => and(eq(rigQuestions.labId, labId), eq(rigQuestions.id, id));

export async function layQuestion(db: Handle, key: Key, { question, nowUtcMs }: { question: RigQuestion; nowUtcMs: number }) {
  await db.insert(rigQuestions).values({ labId: key.labId, id: key.id, question, askedAt: nowUtcMs });
}

/** Takes a question; of several that try one gets it. */
export async function takeQuestion(db: Handle, key: Key, holder: string): Promise<RigQuestion | null> {
  const rows = await db
    .update(rigQuestions)
    .set({ takenBy: holder })
    .where(and(byKey(key), isNull(rigQuestions.takenBy)))
    .returning({ question: rigQuestions.question });
  return (rows[0]?.question ?? null) as RigQuestion | null;
}

/** Removes a question that nobody has taken; false where somebody has. */
export async function withdrawQuestion(db: Handle, key: Key): Promise<boolean> {
  const rows = await db
    .delete(rigQuestions)
    .where(and(byKey(key), isNull(rigQuestions.takenBy)))
    .returning({ id: rigQuestions.id });
  return rows.length === 1;
}

export async function answerQuestion(db: Handle, key: Key, reply: RigReply): Promise<void> {
  await db.update(rigQuestions).set({ reply }).where(byKey(key));
}

/** The answer, removed with its question; null while there is none. */
export async function collectAnswer(db: Handle, key: Key): Promise<RigReply | null> {
  const rows = await db
    .delete(rigQuestions)
    .where(and(byKey(key), isNotNull(rigQuestions.reply)))
    .returning({ reply: rigQuestions.reply });
  return (rows[0]?.reply ?? null) as RigReply | null;
}

/** Removes questions of processes that are gone. */
export async function sweepQuestions(db: Handle, beforeUtcMs: number): Promise<void> {
  await db.delete(rigQuestions).where(lte(rigQuestions.askedAt, beforeUtcMs));
}
