import { randomBytes } from 'node:crypto';
import { createSessions } from '@/server/auth/sessions';
import type { SessionPort } from '@/server/interfaces/sessions';
import { addMember, changeMember } from '@/server/store/people';
import { sweepSessions } from '@/server/store/session-rows';
import type { Role } from '@/shared/contracts/roles';
import { databaseOfThisFile } from '@/tests/support/database';
import { eveningUtcMs, makeLab, makeMember, makeUser, sha256 } from '../store/rows';

const hourMs = 3_600_000;
const dayMs = 24 * hourMs;
const device = { userAgent: 'a phone', ip: '127.0.0.1' };

/** What every implementation of the port must do, whatever is behind it. */
function describeSessionPort(name: string, make: (nowUtcMs: () => number) => SessionPort) {
  describe(name, () => {
    let nowUtcMs = eveningUtcMs;
    const port = () => make(() => nowUtcMs);
    const person = async (role: Role) => {
      const lab = await makeLab(db());
      return { lab, user: await makeMember(db(), lab.id, role) };
    };
    beforeEach(() => {
      nowUtcMs = eveningUtcMs;
    });

    test('a token names its account until it is ended', async () => {
      const { user } = await person('operator');
      const { token } = await port().create(user.id, device);
      expect(await port().validate(token)).toMatchObject({
        userId: user.id,
        createdAt: new Date(eveningUtcMs),
        authAt: new Date(eveningUtcMs),
      });
      await port().end(token);
      expect(await port().validate(token)).toBeNull();
    });

    test('every sign-in gets a token of its own, and ending one leaves the other', async () => {
      const { user } = await person('operator');
      const [first, second] = [await port().create(user.id, device), await port().create(user.id, device)];
      expect(first.token).not.toBe(second.token);
      await port().end(first.token);
      expect(await port().validate(second.token)).not.toBeNull();
    });

    test('all sessions of an account end together, those of others stay', async () => {
      const [one, other] = [await person('operator'), await person('owner')];
      const tokens = [await port().create(one.user.id, device), await port().create(one.user.id, device)];
      const foreign = await port().create(other.user.id, device);
      await port().endAllOf(one.user.id);
      for (const { token } of tokens) expect(await port().validate(token)).toBeNull();
      expect(await port().validate(foreign.token)).not.toBeNull();
    });

    test.each(['', 'x', 'no such token', "' or true --"])('the token "%s" is nobody', async (token) => {
      expect(await port().validate(token)).toBeNull();
      await port().end(token);
    });

    test.each(['owner', 'keeper', 'operator', 'analyst'] as const)('a session of an %s ends after 12 h unused', async (role) => {
      const { user } = await person(role);
      const { token } = await port().create(user.id, device);
      nowUtcMs += 12 * hourMs - 1;
      const near = await port().create(user.id, device);
      expect(await port().validate(near.token)).not.toBeNull();
      nowUtcMs += 1;
      expect(await port().validate(token)).toBeNull();
    });

    test('use moves the idle end on, but never past 7 days', async () => {
      const { user } = await person('operator');
      const { token, expiresAt } = await port().create(user.id, device);
      expect(expiresAt).toEqual(new Date(eveningUtcMs + 7 * dayMs));
      for (; nowUtcMs < eveningUtcMs + 7 * dayMs; nowUtcMs += 7 * hourMs) expect(await port().validate(token)).not.toBeNull();
      nowUtcMs = eveningUtcMs + 7 * dayMs - 1;
      expect((await port().validate(token))?.expiresAt).toEqual(new Date(eveningUtcMs + 7 * dayMs));
      nowUtcMs += 1;
      expect(await port().validate(token)).toBeNull();
    });

    test('who only looks may be away for 30 days, and signs in anew after 90', async () => {
      const { user } = await person('viewer');
      const { token, expiresAt } = await port().create(user.id, device);
      expect(expiresAt).toEqual(new Date(eveningUtcMs + 90 * dayMs));
      nowUtcMs += 30 * dayMs - 1;
      expect(await port().validate(token)).not.toBeNull();
      nowUtcMs += 30 * dayMs;
      expect(await port().validate(token)).toBeNull();
    });

    test('a viewer who becomes operator has the shorter limits at once', async () => {
      const { lab, user } = await person('viewer');
      const { token } = await port().create(user.id, device);
      nowUtcMs += dayMs;
      await db().transaction((tx) => changeMember(tx, { labId: lab.id, userId: user.id, role: 'operator' }));
      expect((await port().validate(token))?.expiresAt).toEqual(new Date(nowUtcMs + 12 * hourMs));
      for (; nowUtcMs < eveningUtcMs + 7 * dayMs; nowUtcMs += 11 * hourMs) expect(await port().validate(token)).not.toBeNull();
      expect(await port().validate(token)).toBeNull();
    });

    test('a role that may act in any lab decides', async () => {
      const { user } = await person('viewer');
      const other = await makeLab(db());
      await addMember(db(), { labId: other.id, userId: user.id, role: 'analyst', nowUtcMs });
      const { expiresAt } = await port().create(user.id, device);
      expect(expiresAt).toEqual(new Date(eveningUtcMs + 7 * dayMs));
    });

    test('an account without a lab has the shorter limits', async () => {
      const { expiresAt } = await port().create((await makeUser(db())).id, device);
      expect(expiresAt).toEqual(new Date(eveningUtcMs + 7 * dayMs));
    });
  });
}

const database = databaseOfThisFile();
const db = () => database().connection.db;
const newToken = () => randomBytes(32).toString('base64url');

describeSessionPort('sessions by Lucia', (nowUtcMs) => createSessions({ db: db(), clock: { utcMs: nowUtcMs }, newToken, sha256 }));

test('the database never holds a token', async () => {
  const port = createSessions({ db: db(), clock: { utcMs: () => eveningUtcMs }, newToken, sha256 });
  const { token } = await port.create((await makeUser(db())).id, device);
  const { rows } = await database().connection.pool.query('select * from sessions');
  expect(JSON.stringify(rows)).not.toContain(token);
  expect(JSON.stringify(rows)).toContain(sha256(token));
});

test('sessions past their absolute end are swept, idle ones kept for hold and stop', async () => {
  await database().connection.pool.query('delete from sessions');
  const port = createSessions({ db: db(), clock: { utcMs: () => eveningUtcMs }, newToken, sha256 });
  await port.create((await makeUser(db())).id, device);
  expect(await sweepSessions(db(), eveningUtcMs + 2 * dayMs)).toBe(0);
  expect(await sweepSessions(db(), eveningUtcMs + 7 * dayMs)).toBe(1);
});
