import { randomBytes } from 'node:crypto';
import { demoIds, seedDemo } from '@/db/demo/seed';
import { createSessions } from '@/server/auth/sessions';
import { RealClock } from '@/server/boot/real-clock';
import { sha256Hex } from '@/server/evaluation/sha256';
import { addMember, createUser } from '@/server/store/people';
import type { Role } from '@/shared/contracts/roles';
import type { BenchDatabase } from './fresh-database';

const clock = new RealClock();
const passwordHash = 'nobody signs in here';

/** Makes the demo lab with its rig. */
export async function seedLab({ connection }: BenchDatabase): Promise<void> {
  await seedDemo(connection, { nowUtcMs: clock.utcMs(), hashPassword: async () => passwordHash, sha256: sha256Hex, link: 'simulated' });
}

/** Makes so many members of the lab, who are no demo accounts. Returns the cookie of a session of each. */
export async function addMembers({ connection: { db } }: BenchDatabase, role: Role, count = 1): Promise<[string, ...string[]]> {
  const newToken = () => randomBytes(32).toString('base64url');
  const sessions = createSessions({ db, clock, newToken, sha256: sha256Hex });
  const cookies: string[] = [];
  for (let number = 1; number <= count; number += 1) {
    const nowUtcMs = clock.utcMs();
    const email = `${role}-${String(number)}@quillfen.example`;
    const user = await createUser(db, { name: `Member ${String(number)}`, email, passwordHash, nowUtcMs });
    if (user === null) throw new Error(`${email} exists already`);
    await addMember(db, { labId: demoIds.lab, userId: user.id, role, nowUtcMs });
    cookies.push(`ef=${(await sessions.create(user.id, { userAgent: 'bench', ip: '127.0.0.1' })).token}`);
  }
  return cookies as [string, ...string[]];
}
