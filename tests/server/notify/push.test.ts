import { createECDH, createPublicKey, randomBytes, verify } from 'node:crypto';
import { createServer } from 'node:http';
import type { AddressInfo } from 'node:net';
import { decrypt } from 'http_ece';
import { createOutgoing, isPublicAddress, checkedUrl } from '@/server/notify/outgoing';
import { createWebPush } from '@/server/notify/web-push';
import { databaseOfThisFile } from '@/tests/support/database';

/** A push service on loopback, and a browser's keys with which its messages can be read (http_ece: not the code that encrypts). */

const database = databaseOfThisFile();
const browser = createECDH('prime256v1');
browser.generateKeys();
const auth = randomBytes(16);

interface Got {
  headers: Record<string, unknown>;
  body: Buffer;
}
const got: Got[] = [];
let answer = 201;
const service = createServer((req, res) => {
  const parts: Buffer[] = [];
  req.on('data', (part: Buffer) => parts.push(part));
  req.on('end', () => {
    got.push({ headers: req.headers, body: Buffer.concat(parts) });
    res.writeHead(answer, answer === 302 ? { location: 'http://127.0.0.1/elsewhere' } : {}).end();
  });
});
let host = '';
beforeAll(async () => {
  await new Promise<void>((resolve) => void service.listen(0, '127.0.0.1', resolve));
  host = `127.0.0.1:${String((service.address() as AddressInfo).port)}`;
});
afterAll(() => new Promise((resolve) => void service.close(resolve)));

const nowUtcMs = () => Date.parse('2031-02-14T21:00:00Z');
const pushOf = (privateHosts: string[]) =>
  createWebPush({
    db: database().connection.db,
    outgoing: createOutgoing(privateHosts),
    subject: 'mailto:evenfall@quillfen.example',
    nowUtcMs,
  });
const target = () => ({
  endpoint: `http://${host}/message/1`,
  p256dh: browser.getPublicKey().toString('base64url'),
  auth: auth.toString('base64url'),
});
const message = { title: 'Interlock or door opened: North bench', body: '21:00:12', path: '/alarms/1', tag: 'alarm-1', quiet: false };

test('the browser can read the message, and the service can see who sent it', async () => {
  const push = pushOf([host]);
  expect(await push.send(target(), message)).toBe('sent');
  const { headers, body } = got.at(-1) as Got;
  const dh = Buffer.from(browser.getPublicKey());
  const plain = decrypt(body, {
    version: 'aes128gcm',
    privateKey: browser,
    dh: dh.toString('base64url'),
    authSecret: auth.toString('base64url'),
  });
  expect(JSON.parse(plain.toString())).toEqual(message);
  expect(body.includes('North bench')).toBe(false);
  expect(headers).toMatchObject({ 'content-encoding': 'aes128gcm', ttl: '14400', urgency: 'high' });

  // RFC 8292: a JWT signed with ES256 under the key that the browser was given.
  const [, token = '', key = ''] = /^vapid t=([^,]+), ?k=(.+)$/.exec(String(headers.authorization)) ?? [];
  expect(key).toBe(await push.publicKey());
  const [head = '', claims = '', signature = ''] = token.split('.');
  const point = Buffer.from(key, 'base64url');
  const jwk = { kty: 'EC', crv: 'P-256', x: point.subarray(1, 33).toString('base64url'), y: point.subarray(33).toString('base64url') };
  const publicKey = createPublicKey({ key: jwk, format: 'jwk' });
  const signed = Buffer.from(`${head}.${claims}`);
  expect(verify('sha256', signed, { key: publicKey, dsaEncoding: 'ieee-p1363' }, Buffer.from(signature, 'base64url'))).toBe(true);
  expect(JSON.parse(Buffer.from(claims, 'base64url').toString())).toMatchObject({
    aud: `http://${host}`,
    sub: 'mailto:evenfall@quillfen.example',
  });
});

test('all processes sign with one key; a browser that is gone is told apart from a service that fails', async () => {
  expect(await pushOf([]).publicKey()).toBe(await pushOf([host]).publicKey());
  answer = 410;
  expect(await pushOf([host]).send(target(), message)).toBe('gone');
  answer = 500;
  await expect(pushOf([host]).send(target(), message)).rejects.toThrow('answered 500');
  answer = 302;
  await expect(pushOf([host]).send(target(), message)).rejects.toThrow('redirect');
  answer = 201;
});

test('nothing is sent into a private network that nobody allowed', async () => {
  const count = got.length;
  await expect(pushOf([]).send(target(), message)).rejects.toThrow('https://');
  await expect(createOutgoing([]).send({ url: `https://localhost:${host.split(':')[1] ?? ''}/`, method: 'GET' })).rejects.toThrow(
    'private network',
  );
  expect(got.length).toBe(count);
  for (const url of [
    'https://10.1.2.3/',
    'https://0x7f.1/',
    'https://[fd00::1]/',
    'https://[::ffff:192.168.1.1]/',
    'https://169.254.169.254/latest',
  ])
    expect(() => checkedUrl(url, [])).toThrow('private network');
  for (const address of [
    '127.0.0.1',
    '10.0.0.1',
    '172.31.0.1',
    '192.168.1.1',
    '100.64.0.1',
    '::1',
    'fe80::1',
    '::ffff:10.0.0.1',
    '0.0.0.0',
    'nonsense',
  ])
    expect({ address, open: isPublicAddress(address) }).toEqual({ address, open: false });
  for (const address of ['93.184.216.34', '2606:2800:220:1::1']) expect(isPublicAddress(address)).toBe(true);
});
