import { auditPage } from '@/server/store/audit';
import { databaseOfThisFile } from '@/tests/support/database';
import { makeLab } from '../store/rows';
import { Caller, caller, member, password, peopleApp, tokenIn, type PeopleApp } from './people-app';

const database = databaseOfThisFile();
const connection = () => database().connection;
let world: PeopleApp;
let labId: string;

beforeEach(async () => {
  await connection().pool.query('delete from rate_limits; delete from jobs');
  world = await peopleApp(connection());
  labId = (await makeLab(connection().db)).id;
});
afterEach(() => world.close());

describe('signing in', () => {
  test('answers who it is and in which labs, and sets a cookie that scripts cannot read', async () => {
    const user = await member(connection(), labId, { role: 'operator', name: 'Ilse Marrow' });
    const answer = await new Caller(world.app).signIn(user.email.toUpperCase()).expect(200);
    expect(answer.body).toEqual({
      user: { id: user.id, name: 'Ilse Marrow', email: user.email },
      memberships: [{ labId, labName: 'Quillfen Gravity Laboratory', timeZone: 'Europe/Zurich', role: 'operator' }],
      sessionExpiresAt: '2031-05-07T08:00:00.000Z',
    });
    expect(answer.headers['set-cookie']).toEqual([expect.stringMatching(/^ef=[\w-]{43}; Path=\/; Expires=[^;]+; HttpOnly; SameSite=Lax$/)]);
  });

  test('over TLS the cookie is bound to the host', async () => {
    const tls = await peopleApp(connection(), { publicUrl: 'https://balance.example' });
    const user = await member(connection(), labId, { role: 'operator' });
    const answer = await new Caller(tls.app).signIn(user.email).expect(200);
    expect(answer.headers['set-cookie']).toEqual([expect.stringMatching(/^__Host-ef=.*; Path=\/;.*HttpOnly; Secure; SameSite=Lax$/)]);
    await tls.close();
  });

  test('is refused alike for a wrong password, an unknown address and a demo account', async () => {
    const user = await member(connection(), labId, { role: 'operator' });
    const demo = await member(connection(), labId, { role: 'owner', demo: true });
    const answers = [
      await new Caller(world.app).signIn(user.email, 'lantern moss granite'),
      await new Caller(world.app).signIn('nobody@quillfen.example'),
      await new Caller(world.app).signIn(demo.email),
    ];
    for (const { status, body, headers } of answers) {
      expect(status).toBe(401);
      expect(headers['set-cookie']).toBeUndefined();
      expect({ ...(body as object), instance: '' }).toEqual({ ...(answers[0]?.body as object), instance: '' });
    }
    expect(answers[0]?.body).toMatchObject({ code: 'wrong-credentials', detail: expect.stringContaining('do not belong together') });
  });

  test('as a demo account works where the server is a demo', async () => {
    const demo = await peopleApp(connection(), { demo: true });
    const user = await member(connection(), labId, { role: 'owner', demo: true });
    await new Caller(demo.app).signIn(user.email).expect(200);
    await demo.close();
  });

  test('is refused for a while after ten wrong passwords, also with the right one, and says how long', async () => {
    const user = await member(connection(), labId, { role: 'operator' });
    const browser = new Caller(world.app);
    for (let n = 0; n < 10; n += 1) await browser.signIn(user.email, 'wrong').expect(401);
    await world.clock.advance(60_000);
    const refused = await browser.signIn(user.email).expect(429);
    expect(refused.headers['retry-after']).toBe('840');
    expect(refused.body).toMatchObject({
      code: 'too-many-requests',
      detail: 'There were too many tries that failed. Try again in 14 min.',
    });
    await browser.signIn((await member(connection(), labId, { role: 'viewer' })).email).expect(200);
    await world.clock.advance(840_000);
    await browser.signIn(user.email).expect(200);
  });

  test('does not count against the limit when it succeeds', async () => {
    const user = await member(connection(), labId, { role: 'operator' });
    for (let n = 0; n < 25; n += 1) await new Caller(world.app).signIn(user.email).expect(200);
  });

  test('counts failures of one address on many accounts', async () => {
    const browser = new Caller(world.app);
    for (let n = 0; n < 100; n += 1) await browser.signIn(`nobody${n}@quillfen.example`).expect(401);
    await browser.signIn('nobody100@quillfen.example').expect(429);
  }, 30_000);

  test('from another site is refused', async () => {
    const user = await member(connection(), labId, { role: 'operator' });
    const answer = await new Caller(world.app).post('/session', { email: user.email, password }).set('Sec-Fetch-Site', 'cross-site');
    expect(answer.body).toMatchObject({ status: 403, code: 'cross-site' });
  });
});

describe('signing out', () => {
  test('ends the session and takes the cookie back', async () => {
    const user = await member(connection(), labId, { role: 'operator' });
    const browser = await caller(world.app, user.email);
    await browser.get('/session').expect(200);
    const answer = await browser.delete('/session').expect(204);
    expect(answer.headers['set-cookie']?.[0]).toMatch(/^ef=;/);
    await browser.get('/session').expect(401);
  });

  test('leaves its mark in the audit of each of the labs', async () => {
    const user = await member(connection(), labId, { role: 'operator', name: 'Ilse Marrow' });
    const browser = await caller(world.app, user.email);
    await browser.delete('/session').expect(204);
    const rows = await auditPage(connection().db, { labId, beforeSeq: null, limit: 10 });
    expect(rows.map((row) => [row.kind, row.data.who])).toEqual([
      ['person.signed-out', { id: user.id, name: 'Ilse Marrow' }],
      ['person.signed-in', { id: user.id, name: 'Ilse Marrow' }],
    ]);
  });
});

describe('a forgotten password', () => {
  test('is replaced by the link of a mail, once, and all sessions end', async () => {
    const user = await member(connection(), labId, { role: 'operator', name: 'Ilse Marrow' });
    const signedIn = await caller(world.app, user.email);
    const browser = new Caller(world.app);
    await browser.post('/password-resets', { email: user.email }).expect(202, { sent: true });
    const [mail] = await world.mails();
    expect(mail).toMatchObject({ to: user.email, subject: 'Set a new password for Evenfall' });
    expect(mail?.text).toMatch(/Hello Ilse Marrow,[^]*http:\/\/127\.0\.0\.1:\d+\/reset-password\?token=[\w-]{43}\n[^]*within 30 minutes/);
    const token = tokenIn(mail?.text ?? '');

    await browser.post('/password-resets/complete', { token, password: 'harbour fog, seven bells' }).expect(204);
    await signedIn.get('/session').expect(401);
    await browser.signIn(user.email).expect(401);
    await browser.signIn(user.email, 'harbour fog, seven bells').expect(200);
    const again = await browser.post('/password-resets/complete', { token, password: 'another good one here' }).expect(404);
    expect(again.body.detail).toBe('This link was used before or is too old. Ask for a new one.');
    expect(await world.mails()).toEqual([expect.objectContaining({ to: user.email, subject: 'Your Evenfall password was changed' })]);
  });

  test('of an unknown address gets the same answer and no mail', async () => {
    await new Caller(world.app).post('/password-resets', { email: 'nobody@quillfen.example' }).expect(202, { sent: true });
    expect(await world.mails()).toEqual([]);
  });

  test('that is replaced by a weak one is refused with the reason, and the link can still be used', async () => {
    const user = await member(connection(), labId, { role: 'operator' });
    const browser = new Caller(world.app);
    await browser.post('/password-resets', { email: user.email }).expect(202);
    const token = tokenIn((await world.mails())[0]?.text ?? '');
    const refused = await browser.post('/password-resets/complete', { token, password: 'password1234' }).expect(400);
    expect(refused.body).toMatchObject({
      code: 'invalid-input',
      errors: [{ path: 'password', message: expect.stringContaining('tried first') }],
    });
    await browser.post('/password-resets/complete', { token, password: 'short' }).expect(400);
    await browser.post('/password-resets/complete', { token, password: 'harbour fog, seven bells' }).expect(204);
  });

  test('has half an hour, and a newer link ends the older', async () => {
    const user = await member(connection(), labId, { role: 'operator' });
    const browser = new Caller(world.app);
    await browser.post('/password-resets', { email: user.email });
    await browser.post('/password-resets', { email: user.email });
    const [first, second] = (await world.mails()).map((mail) => tokenIn(mail.text));
    await browser.post('/password-resets/complete', { token: first, password: 'harbour fog, seven bells' }).expect(404);
    await world.clock.advance(30 * 60_000);
    await browser.post('/password-resets/complete', { token: second, password: 'harbour fog, seven bells' }).expect(404);
  });

  test('can be asked for five times an hour', async () => {
    const browser = new Caller(world.app);
    for (let n = 0; n < 5; n += 1) await browser.post('/password-resets', { email: 'a@quillfen.example' }).expect(202);
    const refused = await browser.post('/password-resets', { email: 'a@quillfen.example' }).expect(429);
    expect(refused.headers['retry-after']).toBe('3600');
  });

  test('never has its link made from a host that somebody wrote into the request', async () => {
    const user = await member(connection(), labId, { role: 'operator' });
    await new Caller(world.app).post('/password-resets', { email: user.email }).set('Host', 'evil.example').expect(202);
    expect((await world.mails())[0]?.text).toContain('http://127.0.0.1:4460/reset-password');
  });

  test('leaves no token in the database', async () => {
    const user = await member(connection(), labId, { role: 'operator' });
    await new Caller(world.app).post('/password-resets', { email: user.email });
    const token = tokenIn((await world.mails())[0]?.text ?? '');
    const { rows } = await connection().pool.query(
      'select (select json_agg(j) from jobs j)::text as jobs, (select json_agg(p) from password_resets p)::text as resets',
    );
    expect(rows[0].resets).toContain(user.id);
    expect(`${rows[0].jobs} ${rows[0].resets}`).not.toContain(token);
  });
});
