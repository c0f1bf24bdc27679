import { verifyChain } from '@/shared/archive/chain';
import type { ChainedEvent } from '@/shared/archive/run-records';
import { roles } from '@/shared/contracts/roles';
import { changeMember } from '@/server/store/people';
import { auditPage } from '@/server/store/audit';
import { databaseOfThisFile } from '@/tests/support/database';
import { makeLab, sha256 } from '../store/rows';
import { Caller, caller, member, password, peopleApp, tokenIn, type PeopleApp } from './people-app';

const database = databaseOfThisFile();
const connection = () => database().connection;
let world: PeopleApp;
let labId: string;
let owner: Caller;
let ownerId: string;
const dayMs = 24 * 3_600_000;

beforeEach(async () => {
  await connection().pool.query('delete from rate_limits; delete from jobs');
  world = await peopleApp(connection());
  labId = (await makeLab(connection().db)).id;
  const user = await member(connection(), labId, { role: 'owner', name: 'Ottilie Brand' });
  ownerId = user.id;
  owner = await caller(world.app, user.email);
});
afterEach(() => world.close());

const invite = async (email: string, role = 'operator') => {
  const answer = await owner.post(`/labs/${labId}/invitations`, { email, role }).expect(201);
  const [mail] = await world.mails();
  return { id: (answer.body as { id: string }).id, mail, token: tokenIn(mail?.text ?? '') };
};

describe('an invitation', () => {
  test('goes out as a mail in plain words and makes a new account a member', async () => {
    const { mail, token } = await invite('Tam.Ferrow@quillfen.example');
    expect(mail).toMatchObject({ to: 'tam.ferrow@quillfen.example', subject: 'Invitation to Quillfen Gravity Laboratory' });
    expect(mail?.text).toMatch(
      /Ottilie Brand invites you[^]*as operator\.[^]*arm the rig[^]*\/invitations\/[\w-]{43}\n[^]*once, until 2031-05-13 22:00, Europe\/Zurich/,
    );

    const newcomer = new Caller(world.app);
    const offer = await newcomer.get(`/invitations/${token}`).expect(200);
    expect(offer.body).toEqual({
      labName: 'Quillfen Gravity Laboratory',
      email: 'tam.ferrow@quillfen.example',
      role: 'operator',
      hasAccount: false,
    });
    const joined = await newcomer
      .post(`/invitations/${token}/accept`, { name: ' Tam Ferrow ', password: 'harbour fog, seven bells' })
      .expect(200);
    expect(joined.body).toMatchObject({ user: { name: 'Tam Ferrow' }, memberships: [{ labId, role: 'operator' }] });
    await newcomer.get(`/labs/${labId}`).expect(200);
    const list = await owner.get(`/labs/${labId}/members`).expect(200);
    expect(list.body.members.map((one: { name: string }) => one.name)).toEqual(['Ottilie Brand', 'Tam Ferrow']);
    expect(list.body.invitations).toEqual([]);
  });

  test('of somebody with an account is accepted with that account and its password', async () => {
    const other = await makeLab(connection().db, 'Another lab');
    const known = await member(connection(), other.id, { role: 'viewer', name: 'Pim Olde' });
    const { token } = await invite(known.email, 'analyst');
    const browser = new Caller(world.app);
    expect((await browser.get(`/invitations/${token}`)).body.hasAccount).toBe(true);
    const wrong = await browser.post(`/invitations/${token}/accept`, { password: 'not my password' }).expect(401);
    expect(wrong.body).toMatchObject({ code: 'wrong-credentials', detail: expect.stringContaining('the password of your account') });
    const joined = await browser.post(`/invitations/${token}/accept`, { password }).expect(200);
    expect(joined.body.memberships.map((one: { role: string }) => one.role)).toEqual(['viewer', 'analyst']);
  });

  test('is used once', async () => {
    const { token } = await invite('tam@quillfen.example');
    await new Caller(world.app).post(`/invitations/${token}/accept`, { name: 'Tam', password: 'harbour fog, seven bells' }).expect(200);
    const again = await new Caller(world.app)
      .post(`/invitations/${token}/accept`, { name: 'Tam', password: 'harbour fog, seven bells' })
      .expect(404);
    expect(again.body.detail).toContain('used, withdrawn or is too old');
  });

  test('accepted by two at the same moment makes one account', async () => {
    const { token } = await invite('twice@quillfen.example');
    const answers = await Promise.all(
      [1, 2].map(() => new Caller(world.app).post(`/invitations/${token}/accept`, { name: 'Tam', password: 'harbour fog, seven bells' })),
    );
    expect(answers.map((answer) => answer.status).sort()).toEqual([200, 404]);
  });

  test('ends after seven days', async () => {
    const { token } = await invite('late@quillfen.example');
    await world.clock.advance(7 * dayMs - 1);
    await new Caller(world.app).get(`/invitations/${token}`).expect(200);
    await world.clock.advance(1);
    await new Caller(world.app).get(`/invitations/${token}`).expect(404);
  });

  test('can be withdrawn, once', async () => {
    const { id, token } = await invite('gone@quillfen.example');
    await owner.delete(`/labs/${labId}/invitations/${id}`).expect(204);
    await owner.delete(`/labs/${labId}/invitations/${id}`).expect(404);
    await new Caller(world.app).get(`/invitations/${token}`).expect(404);
  });

  test('without a name or with a weak password says what is missing and stays open', async () => {
    const { token } = await invite('new@quillfen.example');
    const browser = new Caller(world.app);
    const nameless = await browser.post(`/invitations/${token}/accept`, { password: 'harbour fog, seven bells' }).expect(400);
    expect(nameless.body.errors).toEqual([{ path: 'name', message: 'a new account needs a name' }]);
    const short = await browser.post(`/invitations/${token}/accept`, { name: 'New', password: 'short' }).expect(400);
    expect(short.body.errors).toEqual([{ path: 'password', message: 'a password has at least 12 characters' }]);
    await browser.post(`/invitations/${token}/accept`, { name: 'New', password: 'newnewnewnew' }).expect(400);
    await browser.post(`/invitations/${token}/accept`, { name: 'New', password: 'harbour fog, seven bells' }).expect(200);
  });

  test('of a member, and a second one for the same address, are refused', async () => {
    const known = await member(connection(), labId, { role: 'viewer' });
    const refused = await owner.post(`/labs/${labId}/invitations`, { email: known.email.toUpperCase(), role: 'owner' }).expect(409);
    expect(refused.body).toMatchObject({ code: 'already-exists', detail: expect.stringContaining('is a member') });
    await invite('open@quillfen.example');
    const second = await owner.post(`/labs/${labId}/invitations`, { email: 'open@quillfen.example', role: 'viewer' }).expect(409);
    expect(second.body.detail).toContain('has an open invitation');
  });

  test('sent again with the same key is sent once', async () => {
    const send = () =>
      owner
        .post(`/labs/${labId}/invitations`, { email: 'once@quillfen.example', role: 'viewer' })
        .set('Idempotency-Key', 'one-and-the-same');
    const [first, second] = [await send().expect(201), await send().expect(201)];
    expect(second.body).toEqual(first.body);
    expect(await world.mails()).toHaveLength(1);
  });

  test('tokens are not guessed for long', async () => {
    const browser = new Caller(world.app);
    for (let n = 0; n < 60; n += 1) await browser.get(`/invitations/guess-${n}`).expect(404);
    expect((await browser.get('/invitations/guess').expect(429)).headers['retry-after']).toBe('900');
  });
});

describe('members', () => {
  test.each(roles.filter((role) => role !== 'owner'))('a %s may read the list and change nothing of it', async (role) => {
    const user = await member(connection(), labId, { role });
    const browser = await caller(world.app, user.email);
    await browser.get(`/labs/${labId}/members`).expect(200);
    const refused = await browser.post(`/labs/${labId}/invitations`, { email: 'x@quillfen.example', role: 'viewer' }).expect(403);
    expect(refused.body.detail).toBe(`Your role in Quillfen Gravity Laboratory is ${role}; this needs owner.`);
    await browser.patch(`/labs/${labId}/members/${user.id}`, { role: 'owner' }).expect(403);
    await browser.delete(`/labs/${labId}/members/${ownerId}`).expect(403);
    await browser.patch(`/labs/${labId}`, { name: 'Mine' }).expect(403);
    await browser.get(`/labs/${labId}/audit`).expect(403);
  });

  test('of another lab are not to be seen or touched', async () => {
    const other = await makeLab(connection().db, 'Another lab');
    const stranger = await member(connection(), other.id, { role: 'owner' });
    const browser = await caller(world.app, stranger.email);
    await browser.get(`/labs/${labId}/members`).expect(404);
    await browser.patch(`/labs/${labId}/members/${ownerId}`, { role: 'viewer' }).expect(404);
    await owner.patch(`/labs/${labId}/members/${stranger.id}`, { role: 'viewer' }).expect(404);
    await owner.delete(`/labs/${labId}/members/not-an-id`).expect(404);
  });

  test('get another role, which holds at once', async () => {
    const user = await member(connection(), labId, { role: 'viewer', name: 'Pim Olde' });
    const browser = await caller(world.app, user.email);
    await browser.get(`/labs/${labId}/audit`).expect(403);
    const changed = await owner.patch(`/labs/${labId}/members/${user.id}`, { role: 'owner' }).expect(200);
    expect(changed.body).toMatchObject({ userId: user.id, name: 'Pim Olde', role: 'owner' });
    await browser.get(`/labs/${labId}/audit`).expect(200);
  });

  test('who are removed are out at once', async () => {
    const user = await member(connection(), labId, { role: 'keeper' });
    const browser = await caller(world.app, user.email);
    await owner.delete(`/labs/${labId}/members/${user.id}`).expect(204);
    await browser.get(`/labs/${labId}`).expect(404);
    await browser.get('/session').expect(200);
  });

  test('always have an owner among them', async () => {
    const refused = await owner.patch(`/labs/${labId}/members/${ownerId}`, { role: 'keeper' }).expect(409);
    expect(refused.body).toMatchObject({ code: 'not-possible-now', detail: expect.stringContaining('no other owner') });
    await owner.delete(`/labs/${labId}/members/${ownerId}`).expect(409);
    const second = await member(connection(), labId, { role: 'owner' });
    await owner.delete(`/labs/${labId}/members/${ownerId}`).expect(204);
    expect(await connection().db.transaction((tx) => changeMember(tx, { labId, userId: second.id, role: null }))).toBe('last-owner');
  });

  test('keep an owner also when two owners demote each other at the same moment', async () => {
    const second = await member(connection(), labId, { role: 'owner' });
    const other = await caller(world.app, second.email);
    const answers = await Promise.all([
      owner.patch(`/labs/${labId}/members/${second.id}`, { role: 'viewer' }),
      other.patch(`/labs/${labId}/members/${ownerId}`, { role: 'viewer' }),
    ]);
    expect(answers.map((answer) => answer.status)).toContain(200);
    const { rows } = await connection().pool.query(`select count(*)::int as owners from memberships where lab_id = $1 and role = 'owner'`, [
      labId,
    ]);
    expect(rows[0].owners).toBe(1);
  });
});

describe('the lab', () => {
  test('gets another name and time zone; what is no zone is refused with an example', async () => {
    const changed = await owner.patch(`/labs/${labId}`, { name: 'Quillfen', timeZone: 'Pacific/Chatham' }).expect(200);
    expect(changed.body).toEqual({ id: labId, name: 'Quillfen', timeZone: 'Pacific/Chatham' });
    for (const timeZone of ['Europe/Quillfen', '+02:00', 'x']) {
      const refused = await owner.patch(`/labs/${labId}`, { timeZone }).expect(400);
      expect(refused.body.errors[0].message).toContain('for example Europe/Zurich');
    }
    expect((await owner.get(`/labs/${labId}`)).body.timeZone).toBe('Pacific/Chatham');
  });

  test('has an audit chain that tells every act and verifies', async () => {
    const user = await member(connection(), labId, { role: 'viewer' });
    await owner.patch(`/labs/${labId}/members/${user.id}`, { role: 'analyst' });
    await invite('a@quillfen.example');
    await owner.patch(`/labs/${labId}`, { name: 'Quillfen' });
    await owner.delete(`/labs/${labId}/members/${user.id}`);

    const pages: { seq: number; who: string; kind: string; data: Record<string, unknown> }[] = [];
    let next: string | null = '';
    while (next !== null) {
      const answer: { body: { items: typeof pages; next: string | null } } = await owner
        .get(`/labs/${labId}/audit?limit=2${next === '' ? '' : `&cursor=${next}`}`)
        .expect(200);
      pages.push(...answer.body.items);
      next = answer.body.next;
    }
    expect(pages.map((entry) => [entry.seq, entry.who, entry.kind])).toEqual([
      [5, 'Ottilie Brand', 'member.removed'],
      [4, 'Ottilie Brand', 'lab.changed'],
      [3, 'Ottilie Brand', 'member.invited'],
      [2, 'Ottilie Brand', 'member.role-changed'],
      [1, 'Ottilie Brand', 'person.signed-in'],
    ]);
    expect(pages[3]?.data).toMatchObject({ userId: user.id, from: 'viewer', to: 'analyst' });
    const rows = (await auditPage(connection().db, { labId, beforeSeq: null, limit: 100 }))
      .reverse()
      .map(({ labId: _lab, ...link }) => link as ChainedEvent);
    expect(verifyChain(rows, sha256)).toMatchObject({ valid: true, events: 5 });
    expect(JSON.stringify(rows)).not.toContain('@');
  });

  test('a cursor that is none of ours is refused', async () => {
    await owner.get(`/labs/${labId}/audit?cursor=abc`).expect(400);
  });
});
