import { membershipOf, sessionReducer, type SessionEvent, type SessionState } from '@/components/api/session-reducer';
import type { Me } from '@/shared/contracts/people';

const membership = (labId: string) => ({ labId, labName: `Lab ${labId}`, timeZone: 'Europe/Oslo', role: 'operator' as const });
const me: Me = {
  user: { id: 'u1', name: 'Ada Thornfield', email: 'ada@quillfen.example' },
  memberships: [membership('a'), membership('b')],
  sessionExpiresAt: '2031-03-14T00:00:00Z',
};
const nobody: Me = { ...me, memberships: [] };

const unknown: SessionState = { kind: 'unknown' };
const inLab = (labId: string | null): SessionState => ({ kind: 'signed-in', me, labId });
const expired: SessionState = { kind: 'expired', me, labId: 'b' };

const cases: readonly { is: string; before: SessionState; event: SessionEvent; after: SessionState }[] = [
  { is: 'nobody is signed in', before: unknown, event: { kind: 'asked', me: null, rememberedLabId: null }, after: { kind: 'signed-out' } },
  { is: 'the remembered lab is taken', before: unknown, event: { kind: 'asked', me, rememberedLabId: 'b' }, after: inLab('b') },
  { is: 'a remembered lab one has left is not', before: unknown, event: { kind: 'asked', me, rememberedLabId: 'z' }, after: inLab('a') },
  {
    is: 'without a lab there is none',
    before: unknown,
    event: { kind: 'asked', me: nobody, rememberedLabId: 'a' },
    after: { kind: 'signed-in', me: nobody, labId: null },
  },
  { is: 'a refused request keeps who was there', before: inLab('b'), event: { kind: 'refused' }, after: expired },
  { is: 'a second refusal changes nothing', before: expired, event: { kind: 'refused' }, after: expired },
  { is: 'a refusal before anything is known means signed out', before: unknown, event: { kind: 'refused' }, after: { kind: 'signed-out' } },
  {
    is: 'signing in again leads back to the same lab',
    before: expired,
    event: { kind: 'signed-in', me, rememberedLabId: 'a' },
    after: inLab('b'),
  },
  { is: 'signing out forgets', before: inLab('a'), event: { kind: 'signed-out' }, after: { kind: 'signed-out' } },
  { is: 'another lab is chosen', before: inLab('a'), event: { kind: 'lab-chosen', labId: 'b' }, after: inLab('b') },
  { is: 'a lab can be chosen only when signed in', before: expired, event: { kind: 'lab-chosen', labId: 'a' }, after: expired },
];

test.each(cases)('$is', ({ before, event, after }) => {
  expect(sessionReducer(before, event)).toEqual(after);
});

test('the membership stays known while the session has to be renewed', () => {
  expect(membershipOf(expired)?.labName).toBe('Lab b');
  expect(membershipOf({ kind: 'signed-out' })).toBeNull();
});
