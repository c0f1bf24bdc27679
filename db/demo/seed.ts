import { appendEvent, canonicalJson, emptyChain, type Sha256 } from '@/shared/archive/chain';
import type { Role } from '@/shared/contracts/roles';
import { templates } from '@/shared/protocol/templates';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { Connection, Handle } from '../connect';
import * as schema from '../schema';

/** Written on the wall: demo accounts are marked as such, and only a server in demo mode lets them in. */
export const demoPassword = 'swing after sunset';

export interface DemoPerson {
  id: string;
  name: string;
  email: string;
  role: Role;
}

const person = (number: number, name: string, role: Role): DemoPerson => ({
  id: `5eed0000-0000-4000-8000-0000000000${String(number).padStart(2, '0')}`,
  name,
  email: `${name.split(' ')[0]?.toLowerCase() ?? ''}@quillfen.example`,
  role,
});

/** Invented people, one for each role. */
export const demoPeople: readonly DemoPerson[] = [
  person(1, 'Ottilie Vanterpool', 'owner'),
  person(2, 'Casimir Thornquist', 'keeper'),
  person(3, 'Ilse Marrowby', 'operator'),
  person(4, 'Tam Ferrowdale', 'analyst'),
  person(5, 'Pim Oldershaw', 'viewer'),
];

/** The ids of the demo are fixed, so that guides and tests can name them. */
export const demoIds = {
  lab: '5eed0000-0000-4000-8000-000000000100',
  rig: '5eed0000-0000-4000-8000-000000000101',
  massSet: '5eed0000-0000-4000-8000-000000000102',
  emptyControl: '5eed0000-0000-4000-8000-000000000103',
  channel: '5eed0000-0000-4000-8000-000000000104',
  shortProtocol: '5eed0000-0000-4000-8000-000000000105',
  overnightProtocol: '5eed0000-0000-4000-8000-000000000106',
} as const;

export const demoLab = { name: 'Quillfen Gravity Laboratory', timeZone: 'Europe/Zurich' } as const;
export const demoRigName = 'North bench';

export interface SeedParts {
  nowUtcMs: number;
  hashPassword(password: string): Promise<string>;
  sha256: Sha256;
  /** What the demo rig's line leads to; default: the emulated controller board. */
  link?: 'board' | 'simulated';
}

/**
 * Makes the demo lab where it is not there yet, all or nothing: people, rig with mass sets and channel, two protocols.
 * What has been done in the lab since stays as it is.
 * @returns whether the lab was made now
 */
export async function seedDemo(connection: Connection, parts: SeedParts): Promise<boolean> {
  const passwordHash = await parts.hashPassword(demoPassword);
  return connection.db.transaction(async (tx) => {
    const made = await tx
      .insert(schema.labs)
      .values({ id: demoIds.lab, ...demoLab, createdAt: parts.nowUtcMs })
      .onConflictDoNothing()
      .returning({ id: schema.labs.id });
    if (made.length === 0) return false;
    await seedPeople(tx, parts.nowUtcMs, passwordHash);
    await seedRig(tx, parts);
    await seedProtocols(tx, parts);
    const entry = { at: new Date(parts.nowUtcMs).toISOString(), kind: 'lab.made', data: { demo: true, who: { id: null, name: 'demo' } } };
    await tx.insert(schema.audit).values({ labId: demoIds.lab, ...appendEvent(emptyChain, entry, parts.sha256) });
    return true;
  });
}

const withRole = (role: Role): DemoPerson => {
  const found = demoPeople.find((one) => one.role === role);
  if (found === undefined) throw new Error(`the demo has no ${role}`);
  return found;
};

async function seedPeople(tx: Handle, nowUtcMs: number, passwordHash: string): Promise<void> {
  await tx
    .insert(schema.users)
    .values(demoPeople.map(({ id, name, email }) => ({ id, name, email, passwordHash, demo: true, createdAt: nowUtcMs })));
  await tx.insert(schema.memberships).values(demoPeople.map(({ id, role }) => ({ labId: demoIds.lab, userId: id, role, since: nowUtcMs })));
}

async function seedRig(tx: Handle, { nowUtcMs, link = 'board' }: SeedParts): Promise<void> {
  const keeper = withRole('keeper');
  const own = { labId: demoIds.lab, rigId: demoIds.rig };
  await tx.insert(schema.rigs).values({ labId: demoIds.lab, id: demoIds.rig, name: demoRigName, revision: 1, createdAt: nowUtcMs });
  await tx.insert(schema.rigRevisions).values({
    ...own,
    number: 1,
    name: demoRigName,
    document: demoRigWide,
    reason: 'First measurement of the rig',
    madeAt: nowUtcMs,
    madeById: keeper.id,
    madeBy: keeper.name,
  });
  await tx.insert(schema.rigLinks).values({ ...own, settings: { kind: link }, changedAt: nowUtcMs, changedBy: keeper.name });
  await tx.insert(schema.massSets).values([
    { ...own, id: demoIds.massSet, label: 'Lead spheres, 1.6 kg', sources: demoRigWide.sources, createdAt: nowUtcMs },
    // Mass sets are offered oldest first: the loaded one before the control.
    { ...own, id: demoIds.emptyControl, label: 'Empty control', sources: { shape: 'none' }, createdAt: nowUtcMs + 1 },
  ]);
  await tx.insert(schema.cameras).values({ ...own, name: 'Above the rig', kind: 'drawn', madeAt: nowUtcMs, madeBy: keeper.name });
  await tx.insert(schema.channels).values({
    ...own,
    id: demoIds.channel,
    name: 'deflection',
    quantity: 'pendulum angle',
    unit: 'rad',
    role: 'deflection',
    source: 'simulated',
    createdAt: nowUtcMs,
  });
}

const documentOf = (templateId: string) => {
  const template = templates.find(({ id }) => id === templateId);
  if (template === undefined) throw new Error(`there is no template ${templateId}`);
  return template.make(demoRigWide);
};

/** A short protocol with an issued revision, ready to run, and the overnight one as a draft. */
async function seedProtocols(tx: Handle, { nowUtcMs, sha256 }: SeedParts): Promise<void> {
  const operator = withRole('operator');
  const short = documentOf('near-far-short');
  const overnight = documentOf('near-far');
  const updated = { labId: demoIds.lab, updatedAt: nowUtcMs, updatedById: operator.id, updatedBy: operator.name };
  await tx.insert(schema.protocols).values([
    { ...updated, id: demoIds.shortProtocol, name: short.name, document: short },
    { ...updated, id: demoIds.overnightProtocol, name: overnight.name, document: overnight },
  ]);
  await tx.insert(schema.protocolRevisions).values({
    labId: demoIds.lab,
    protocolId: demoIds.shortProtocol,
    number: 1,
    document: short,
    sha256: sha256(canonicalJson(short)),
    note: 'First issue',
    draftVersion: 1,
    rigId: demoIds.rig,
    rigRevision: 1,
    issuedAt: nowUtcMs,
    issuedById: operator.id,
    issuedBy: operator.name,
  });
}
