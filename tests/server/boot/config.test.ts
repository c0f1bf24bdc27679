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

test('files lie in the state folder, in a folder of their own, or in a bucket with its key', () => {
  expect(readConfig({ ...least, EVENFALL_STATE_DIR: '/srv/evenfall' })).toMatchObject({ filesDir: '/srv/evenfall/files', s3: null });
  expect(readConfig(least).databaseDir).toBeNull();
  expect(readConfig({ ...least, EVENFALL_DATABASE_DIR: '/srv/postgresql' }).databaseDir).toBe('/srv/postgresql');
  expect(readConfig({ ...least, EVENFALL_FILES_DIR: '/srv/files' }).filesDir).toBe('/srv/files');
  const bucket = { ...least, EVENFALL_S3_BUCKET: 'nights', EVENFALL_S3_ENDPOINT: 'https://objects.quillfen.example/' };
  const key = { EVENFALL_S3_KEY_ID: 'id', EVENFALL_S3_SECRET: 'secret' };
  expect(readConfig({ ...bucket, ...key, EVENFALL_S3_PREFIX: 'lab/' }).s3).toEqual({
    ...{ bucket: 'nights', region: 'us-east-1', endpoint: 'https://objects.quillfen.example', prefix: 'lab/' },
    ...{ keyId: 'id', secret: 'secret' },
  });
  expect(() => readConfig(bucket)).toThrow('EVENFALL_S3_BUCKET: needs EVENFALL_S3_KEY_ID and EVENFALL_S3_SECRET beside it');
  expect(() => readConfig({ ...bucket, ...key, EVENFALL_S3_PREFIX: '/lab' })).toThrow('EVENFALL_S3_PREFIX: must be names with a slash');
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
