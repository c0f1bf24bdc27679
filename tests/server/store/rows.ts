import { createHash, randomUUID } from 'node:crypto';
import { channels, rigRevisions, rigs } from '@/db/schema';
import { one, type Database } from '@/server/store/database';
import { createLab } from '@/server/store/labs';
import { addMember, createUser, type User } from '@/server/store/people';
import { insertRun } from '@/server/store/run-store';
import type { RunStart } from '@/shared/archive/run-records';
import type { Role } from '@/shared/contracts/roles';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';

/** An evening in an invented lab: rows that store tests stand on. */
export const eveningUtcMs = Date.parse('2031-05-06T20:00:00Z');
export const sha256 = (text: string) => createHash('sha256').update(text, 'utf8').digest('hex');

export const makeLab = (db: Database, name = 'Quillfen Gravity Laboratory') =>
  createLab(db, { name, timeZone: 'Europe/Zurich', nowUtcMs: eveningUtcMs });

export async function makeUser(db: Database, name = 'Ilse Marrow'): Promise<User> {
  const user = await createUser(db, {
    name,
    email: `${name.split(' ')[0]}.${randomUUID().slice(0, 8)}@quillfen.example`,
    passwordHash: 'none',
    nowUtcMs: eveningUtcMs,
  });
  if (user === null) throw new Error('the address is taken');
  return user;
}

export async function makeMember(db: Database, labId: string, role: Role): Promise<User> {
  const user = await makeUser(db, `Member ${role}`);
  await addMember(db, { labId, userId: user.id, role, nowUtcMs: eveningUtcMs });
  return user;
}

export async function makeRig(db: Database, labId: string): Promise<string> {
  const user = await makeUser(db);
  const rig = one(await db.insert(rigs).values({ labId, name: 'North bench', revision: 1, createdAt: eveningUtcMs }).returning());
  await db.insert(rigRevisions).values({
    labId,
    rigId: rig.id,
    number: 1,
    name: rig.name,
    document: demoRigWide,
    reason: 'first',
    madeAt: eveningUtcMs,
    madeById: user.id,
    madeBy: user.name,
  });
  return rig.id;
}

export async function makeChannel(db: Database, labId: string, rigId: string): Promise<string> {
  const row = one(
    await db
      .insert(channels)
      .values({
        labId,
        rigId,
        name: 'deflection',
        quantity: 'angle',
        unit: 'rad',
        role: 'deflection',
        source: 'simulated',
        createdAt: eveningUtcMs,
      })
      .returning(),
  );
  return row.id;
}

const protocol: ProtocolDocument = {
  formatVersion: 1,
  name: 'One swing',
  steps: [{ kind: 'home' }, { kind: 'swing', to: 'near' }],
} as ProtocolDocument;

export const runStart = (labId: string, rigId: string, changes: Partial<RunStart> = {}): RunStart => ({
  labId,
  runId: randomUUID(),
  rigId,
  rigName: 'North bench',
  rigRevision: 1,
  protocolName: protocol.name,
  protocolRevision: 1,
  rig: demoRigWide,
  protocol,
  massSetLabel: 'lead',
  timeZone: 'Europe/Zurich',
  operator: 'Ilse Marrow',
  notes: '',
  arm: null,
  simulated: null,
  ...changes,
});

export async function makeRun(db: Database, start: RunStart): Promise<boolean> {
  return insertRun(db, {
    start,
    protocolId: null,
    massSetId: null,
    startedById: null,
    state: 'starting',
    nowUtcMs: eveningUtcMs,
    predictedEndUtcMs: null,
  });
}
