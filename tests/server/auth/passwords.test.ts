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

test('without an account nothing matches, and finding that out takes as long as with one', async () => {
  const hash = await hashPassword('lantern moss quartz');
  const medianMs = async (passwordHash: string | null) => {
    const times: number[] = [];
    for (let n = 0; n < 15; n += 1) {
      const startMs = performance.now();
      expect(await verifyPassword(passwordHash, 'some other words')).toBe(false);
      times.push(performance.now() - startMs);
    }
    return times.sort((a, b) => a - b)[7] as number;
  };
  await medianMs(hash);
  const ratio = (await medianMs(null)) / (await medianMs(hash));
  // Ample room for a busy machine; skipping the work would make it some thousandth.
  expect(ratio).toBeGreaterThan(0.4);
  expect(ratio).toBeLessThan(2.5);
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
