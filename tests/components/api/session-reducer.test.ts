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

test.each<[string, SessionState, SessionEvent, SessionState]>([
  ['nobody is signed in', unknown, { kind: 'asked', me: null, rememberedLabId: null }, { kind: 'signed-out' }],
  ['the remembered lab is taken', unknown, { kind: 'asked', me, rememberedLabId: 'b' }, inLab('b')],
  ['a remembered lab one has left is not', unknown, { kind: 'asked', me, rememberedLabId: 'z' }, inLab('a')],
  [
    'without a lab there is none',
    unknown,
    { kind: 'asked', me: nobody, rememberedLabId: 'a' },
    { kind: 'signed-in', me: nobody, labId: null },
  ],
  ['a refused request keeps who was there', inLab('b'), { kind: 'refused' }, expired],
  ['a second refusal changes nothing', expired, { kind: 'refused' }, expired],
  ['a refusal before anything is known means signed out', unknown, { kind: 'refused' }, { kind: 'signed-out' }],
  ['signing in again leads back to the same lab', expired, { kind: 'signed-in', me, rememberedLabId: 'a' }, inLab('b')],
  ['signing out forgets', inLab('a'), { kind: 'signed-out' }, { kind: 'signed-out' }],
  ['another lab is chosen', inLab('a'), { kind: 'lab-chosen', labId: 'b' }, inLab('b')],
  ['a lab can be chosen only when signed in', expired, { kind: 'lab-chosen', labId: 'a' }, expired],
])('%s', (_, before, event, after) => {
  expect(sessionReducer(before, event)).toEqual(after);
});

test('the membership stays known while the session has to be renewed', () => {
  expect(membershipOf(expired)?.labName).toBe('Lab b');
  expect(membershipOf({ kind: 'signed-out' })).toBeNull();
});
