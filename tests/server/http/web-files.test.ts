import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { brotliCompressSync } from 'node:zlib';
import compression from 'compression';
import express, { type Request } from 'express';
import request from 'supertest';
import { webFiles } from '@/server/http/web-files';

const script = `console.log(${JSON.stringify('evenfall '.repeat(400))});`;
const hashed = '/_expo/static/js/web/entry-0123456789abcdef0123456789abcdef.js';
const folder = mkdtempSync(join(tmpdir(), 'evenfall-web-'));
mkdirSync(join(folder, '_expo/static/js/web'), { recursive: true });
mkdirSync(join(folder, 'assets'));
writeFileSync(join(folder, hashed), script);
writeFileSync(join(folder, `${hashed}.br`), brotliCompressSync(script));
writeFileSync(join(folder, 'theme.js'), 'document.title;');
const pages = { index: '<!doctype html><title>Evenfall</title>', signIn: '<!doctype html><title>Sign in</title>', offline: '' };
const hasSession = (req: Request) => req.headers.cookie === 'ef=somebody';
const app = express().use(compression(), webFiles(folder, { pages, hasSession }));

afterAll(() => rmSync(folder, { recursive: true, force: true }));

const ask = (path: string, encodings: string) => request(app).get(path).set('Accept-Encoding', encodings);

test('a browser that takes Brotli gets the copy the build packed, as the same script', async () => {
  const answer = await ask(hashed, 'gzip, deflate, br');
  expect(answer.status).toBe(200);
  expect(answer.headers).toMatchObject({
    'content-encoding': 'br',
    'content-length': String(brotliCompressSync(script).length),
    vary: 'Accept-Encoding',
  });
  expect(answer.headers['content-type']).toMatch(/^text\/javascript/);
  expect(answer.text).toBe(script);
});

test.each([
  ['gzip', 'gzip'],
  ['br;q=0, gzip', 'gzip'],
  ['identity', undefined],
])('who says "Accept-Encoding: %s" gets the script without Brotli', async (said, encoding) => {
  const answer = await ask(hashed, said);
  expect(answer.headers['content-encoding']).toBe(encoding);
  expect(answer.headers['vary']).toBe('Accept-Encoding');
  expect(answer.text).toBe(script);
});

test('a file with its hash in its name is kept for a year, packed or not; any other is asked for again', async () => {
  for (const encodings of ['br', 'identity'])
    expect((await ask(hashed, encodings)).headers['cache-control']).toBe('public, max-age=31536000, immutable');
  expect((await ask('/theme.js', 'br')).headers['cache-control']).toBe('no-cache');
  expect((await ask('/runs/17', 'br')).headers['cache-control']).toBe('no-cache');
});

test('a packed file known by its tag is not sent again', async () => {
  const { etag } = (await ask(hashed, 'br')).headers;
  const again = await ask(hashed, 'br').set('If-None-Match', String(etag));
  expect(again.status).toBe(304);
});

test('a script of an earlier build is missing, not the page in its place', async () => {
  expect((await ask('/_expo/static/js/web/entry-ffffffffffffffffffffffffffffffff.js', 'br')).status).toBe(404);
});

test('the sign-in address answers with the page that stands before the program, every other with the one page', async () => {
  expect((await ask('/sign-in?then=%2Fruns%2F17', 'br')).text).toBe(pages.signIn);
  expect((await ask('/runs/17', 'br')).text).toBe(pages.index);
});

test('the front door sends who has no session to the sign-in page, and lets others in', async () => {
  const stranger = await ask('/', 'br');
  expect(stranger.status).toBe(302);
  expect(stranger.headers).toMatchObject({ location: '/sign-in', 'cache-control': 'no-store' });
  expect((await ask('/', 'br').set('Cookie', 'ef=somebody')).text).toBe(pages.index);
});
