import { demoIds, demoPassword, demoPeople, seedDemo } from '@/db/demo/seed';
import { protocolRevisions } from '@/db/schema';
import { hashPassword, verifyPassword, weaknessOf } from '@/server/auth/passwords';
import { findRig, listMassSets } from '@/server/store/rigs';
import { auditPage } from '@/server/store/audit';
import { membersOf, userByEmail } from '@/server/store/people';
import { listProtocols } from '@/server/store/protocols';
import { canonicalJson, verifyChain } from '@/shared/archive/chain';
import { passwordSchema } from '@/shared/contracts/people';
import { roles } from '@/shared/contracts/roles';
import { checkProtocol } from '@/shared/protocol/check';
import { protocolDocumentSchema } from '@/shared/protocol/document';
import { rigDocumentSchema } from '@/shared/rig/document';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs, sha256 } from './rows';

const database = databaseOfThisFile();
const seed = () => seedDemo(database().connection, { nowUtcMs: eveningUtcMs, hashPassword, sha256 });
const db = () => database().connection.db;

test('the demo lab is made once, and a second time leaves it as it is', async () => {
  expect(await Promise.all([seed(), seed()])).toEqual(expect.arrayContaining([true, false]));
  await database().connection.pool.query(`update labs set name = 'Renamed since'`);
  expect(await seed()).toBe(false);
  expect((await database().connection.pool.query('select name from labs')).rows).toEqual([{ name: 'Renamed since' }]);
});

test('it has one person for each role, marked as demo, with the password shown', async () => {
  const members = await membersOf(db(), demoIds.lab);
  expect(members.map((member) => member.role).sort()).toEqual([...roles].sort());
  for (const { email, name } of demoPeople) {
    expect(email).toMatch(/^[a-z]+@quillfen\.example$/);
    const user = await userByEmail(db(), email);
    expect(user).toMatchObject({ name, demo: true });
    expect(await verifyPassword(user?.passwordHash ?? null, demoPassword)).toBe(true);
  }
  expect(passwordSchema.safeParse(demoPassword).success).toBe(true);
  expect(weaknessOf(demoPassword, [])).toBeNull();
});

test('its rig is a rig, with spheres of lead and an empty control', async () => {
  const rig = await findRig(db(), demoIds.lab, demoIds.rig);
  expect(rigDocumentSchema.safeParse(rig?.document).success).toBe(true);
  const sets = await listMassSets(db(), demoIds.lab, demoIds.rig);
  expect(sets.map((set) => set.sources.shape)).toEqual(['sphere', 'none']);
  const { mass, radius } = sets[0]?.sources ?? {};
  // Density of lead: 11 340 kg/m3 (CRC Handbook of Chemistry and Physics, from memory).
  expect((mass?.value ?? 0) / ((4 / 3) * Math.PI * (radius?.value ?? 1) ** 3)).toBeCloseTo(11_340, -2);
});

test('its protocols are right for its rig, one of them issued', async () => {
  const rig = await findRig(db(), demoIds.lab, demoIds.rig);
  const found = await listProtocols(db(), demoIds.lab);
  expect(found).toHaveLength(2);
  for (const { protocol } of found) {
    const document = protocolDocumentSchema.parse(protocol.document);
    expect(rig === null ? null : checkProtocol(document, rig.document)).toEqual([]);
  }
  const [revision] = await db().select().from(protocolRevisions);
  expect(revision).toMatchObject({ protocolId: demoIds.shortProtocol, number: 1, sha256: sha256(canonicalJson(revision?.document)) });
  expect(found.find(({ protocol }) => protocol.id === demoIds.shortProtocol)?.latest).toMatchObject({ number: 1, draftVersion: 1 });
});

test('its audit chain begins with its making', async () => {
  const rows = await auditPage(db(), { labId: demoIds.lab, beforeSeq: null, limit: 10 });
  expect(
    verifyChain(
      rows.map(({ labId: _lab, ...link }) => link),
      sha256,
    ),
  ).toMatchObject({ valid: true, events: 1 });
});
