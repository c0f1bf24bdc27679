import { eq } from 'drizzle-orm';
import { serverSecrets } from '@/db/schema';
import { one, type Database } from './database';

/** A secret that all server processes of one database share: made by the first that asks. */
export async function sharedSecret<T>(
  db: Database,
  { name, make, nowUtcMs }: { name: string; make: () => T; nowUtcMs: number },
): Promise<T> {
  const read = () => db.select({ value: serverSecrets.value }).from(serverSecrets).where(eq(serverSecrets.name, name));
  const [known] = await read();
  if (known !== undefined) return known.value as T;
  await db.insert(serverSecrets).values({ name, value: make(), madeAt: nowUtcMs }).onConflictDoNothing();
  return one(await read()).value as T;
}
