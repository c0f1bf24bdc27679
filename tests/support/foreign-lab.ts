import { addMember, createUser } from '@/server/store/people';
import { createLab } from '@/server/store/labs';
import { createRig } from '@/server/store/rigs';
import { roles, type Role } from '@/shared/contracts/roles';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { TestDatabase } from './database';

/** A second lab with a member of each role, who are strangers to the demo lab, and a rig without a line of its own. */
export async function foreignLab(
  database: TestDatabase,
  nowUtcMs: number,
): Promise<{ labId: string; rigId: string; userOf: Record<Role, string> }> {
  const { db } = database.connection;
  const lab = await createLab(db, { name: 'Harrowmere Physics Rooms', timeZone: 'Europe/Oslo', nowUtcMs });
  const userOf = {} as Record<Role, string>;
  for (const role of roles) {
    const user = await createUser(db, { name: `Harrowmere ${role}`, email: `${role}@harrowmere.example`, passwordHash: 'none', nowUtcMs });
    if (user === null) throw new Error('the account exists already');
    userOf[role] = user.id;
    await addMember(db, { labId: lab.id, userId: user.id, role, nowUtcMs });
  }
  const rigId = await createRig(
    db,
    { labId: lab.id, name: 'East pier', document: demoRigWide, link: { kind: 'simulated' }, massSetLabel: 'Tungsten' },
    { userId: userOf.owner, name: 'Harrowmere owner', at: nowUtcMs },
  );
  return { labId: lab.id, rigId, userOf };
}
