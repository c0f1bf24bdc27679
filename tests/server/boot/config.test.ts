import { ConfigError, readConfig } from '@/server/boot/config';

const least = { DATABASE_URL: 'postgres://somebody@127.0.0.1/evenfall' };

test('one variable is enough; the rest has defaults', () => {
  expect(readConfig(least)).toMatchObject({
    mode: 'development',
    roles: ['web', 'rig', 'worker'],
    host: '127.0.0.1',
    port: 4460,
    publicUrl: null,
    demo: false,
    trustedProxies: 0,
    smtpUrl: null,
    limits: { streamsPerUser: 6, importBytes: 256 * 1_048_576 },
  });
});

test('an empty variable counts as absent, an address loses its last slash', () => {
  expect(readConfig({ ...least, PORT: '', EVENFALL_PUBLIC_URL: 'https://balance.quillfen.example/' })).toMatchObject({
    port: 4460,
    publicUrl: 'https://balance.quillfen.example',
  });
});

test('a process plays the roles that it is given, and no others', () => {
  expect(readConfig({ ...least, EVENFALL_ROLES: 'Worker, web' }).roles).toEqual(['web', 'worker']);
  expect(() => readConfig({ ...least, EVENFALL_ROLES: 'web,engine' })).toThrow(
    'EVENFALL_ROLES: "engine" is no role of a process; the roles are web, rig, worker, with commas between them',
  );
  expect(() => readConfig({ ...least, EVENFALL_ROLES: ' , ' })).toThrow('EVENFALL_ROLES: names no role');
});

test('everything that is wrong is named at once, with what it may be', () => {
  const read = () => readConfig({ PORT: '99999', EVENFALL_DEMO: 'yes', EVENFALL_PUBLIC_URL: 'balance', EVENFALL_SMTP_URL: 'mail.example' });
  expect(read).toThrow(ConfigError);
  expect(read).toThrow(/DATABASE_URL: is needed: postgres:\/\/user:password@host:port\/database/);
  expect(read).toThrow(/PORT: /);
  expect(read).toThrow(/EVENFALL_DEMO: /);
  expect(read).toThrow(/EVENFALL_PUBLIC_URL: must be an address such as/);
  expect(read).toThrow(/EVENFALL_SMTP_URL: must begin with smtp/);
});
