import { hashPassword, verifyPassword, weaknessOf } from '@/server/auth/passwords';

test('a password matches its own hash and no other does', async () => {
  const hash = await hashPassword('lantern moss quartz');
  expect(hash).toMatch(/^\$argon2id\$v=19\$m=19456,t=2,p=1\$/);
  expect(await verifyPassword(hash, 'lantern moss quartz')).toBe(true);
  expect(await verifyPassword(hash, 'lantern moss quarts')).toBe(false);
  expect(await hashPassword('lantern moss quartz')).not.toBe(hash);
});

test('composed and decomposed letters are the same password', async () => {
  const hash = await hashPassword('Zürichsee im Nebel'.normalize('NFC'));
  expect(await verifyPassword(hash, 'Zürichsee im Nebel'.normalize('NFD'))).toBe(true);
});

test('without an account nothing matches, after the same work as with one', async () => {
  const hash = await hashPassword('lantern moss quartz');
  const work = jest.spyOn(jest.requireActual<typeof import('@node-rs/argon2')>('@node-rs/argon2'), 'verify');
  expect(await verifyPassword(hash, 'some other words')).toBe(false);
  expect(await verifyPassword(null, 'some other words')).toBe(false);
  expect(work).toHaveBeenCalledTimes(2);
  const [withAccount, without] = work.mock.calls.map(([encoded]) => String(encoded).split('$'));
  work.mockRestore();
  // Algorithm, version, memory, passes and lanes, then lengths of salt and digest: all that argon2 (RFC 9106) takes time for.
  expect(without?.slice(1, 4)).toEqual(withAccount?.slice(1, 4));
  expect(without?.slice(4).map((part) => part.length)).toEqual(withAccount?.slice(4).map((part) => part.length));
});

test.each([
  'password1234',
  'Password2031!',
  'P@ssw0rd1234',
  'passwordpassword',
  'qwertyuiop123',
  '123456789012',
  'abcdefghijkl',
  'aaaaaaaaaaaa',
  'abababababab',
  'letmein12345',
  'Gravity2031!!',
  'evenfall1234',
  'zyxwvutsrqponm',
  '!!!welcome!!!',
  '111222333444',
  'asdfghjkl;12',
])('%s is refused', (password) => {
  expect(weaknessOf(password, [])).toMatch(/choose a few words/);
});

test.each(['ilse.marrow31', 'MarrowIlse!!', 'quillfen.example'])('%s is little more than what others know of Ilse Marrow', (password) => {
  expect(weaknessOf(password, ['Ilse Marrow', 'ilse.marrow@quillfen.example'])).toMatch(/name or address/);
});

test.each(['lantern moss quartz', 'the tide was late again', 'kY7#mVq2$Lz9', 'Ilse likes cold mornings', 'correct staple horse tram'])(
  '%s is taken',
  (password) => {
    expect(weaknessOf(password, ['Ilse Marrow', 'ilse.marrow@quillfen.example'])).toBeNull();
  },
);
