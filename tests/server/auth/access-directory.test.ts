import type { LivingSession, SessionPort } from '@/server/interfaces/sessions';
import { VirtualClock } from '@/server/engine/virtual-clock';
import { AccessDirectory, type AccessSource } from '@/server/http/access-directory';

const nowUtcMs = Date.UTC(2031, 1, 14, 20);
const user = { id: 'wren', name: 'Wren Alder', email: 'wren@quillfen.example' };
const at = new Date(nowUtcMs - 60_000);
const session = { id: 'hash of token', userId: user.id, createdAt: at, authAt: at, expiresAt: new Date(nowUtcMs + 3_600_000) };
const membership = { labId: 'lab', labName: 'Quillfen', timeZone: 'Europe/Zurich', role: 'operator' as const };

/** A directory whose database answers when it is told to. */
function directory() {
  const answers: (() => void)[] = [];
  const slowly = <T>(value: T) => new Promise<T>((resolve) => void answers.push(() => resolve(value)));
  const source: AccessSource = {
    membership: () => slowly(membership),
    ofLabs: () => slowly({ sessions: [session], users: [user], memberships: [{ ...membership, userId: user.id }] }),
  };
  const sessions = { validate: () => slowly<LivingSession>({ ...session, user }) } as unknown as SessionPort;
  const access = new AccessDirectory({
    source,
    sessions,
    clock: new VirtualClock(nowUtcMs, async () => undefined),
    sha256: (text) => `hash of ${text}`,
  });
  const answer = async (...asked: Promise<unknown>[]) => {
    for (const one of answers.splice(0)) one();
    await Promise.all(asked);
  };
  return { access, answer };
}

test('who is in the labs with a run is known without the database', async () => {
  const { access, answer } = directory();
  await answer(access.refresh(['lab']));
  expect(access.remembered('token', 'lab')).toMatchObject({ me: { name: 'Wren Alder' }, membership: { role: 'operator' } });
  expect(access.remembered('another', 'lab')).toBeNull();
});

test.each(['the copy is taken', 'it is looked up'] as const)('a session that ends while %s stays forgotten', async (when) => {
  const { access, answer } = directory();
  await answer(access.refresh(['lab']));
  const late = when === 'the copy is taken' ? access.refresh(['lab']) : access.signedIn('token');
  access.forgetSession('token');
  await answer(late);
  expect(access.remembered('token', 'lab')).toBeNull();
});

test.each(['the copy is taken', 'it is looked up'] as const)('a membership that changes while %s stays forgotten', async (when) => {
  const { access, answer } = directory();
  await answer(access.refresh(['lab']));
  const late = when === 'the copy is taken' ? access.refresh(['lab']) : access.membership(user.id, 'lab');
  access.forgetUser(user.id);
  await answer(late);
  expect(access.remembered('token', 'lab')).toBeNull();
});
