import { createHash } from 'node:crypto';
import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import request from 'supertest';
import { appWith, counting, member, sent } from './framework-app';

describe('the web application', () => {
  const folder = mkdtempSync(join(tmpdir(), 'evenfall-web-'));
  const style = '#root{height:100%}';
  beforeAll(() => {
    mkdirSync(join(folder, '_expo/static/js'), { recursive: true });
    writeFileSync(
      join(folder, 'index.html'),
      `<!doctype html><html><head><style id="reset">${style}</style></head><body><div id="root"></div><script src="/_expo/static/js/entry-0123456789abcdef0123.js" defer></script></body></html>`,
    );
    writeFileSync(join(folder, '_expo/static/js/entry-0123456789abcdef0123.js'), 'void 0');
  });
  afterAll(() => rmSync(folder, { recursive: true }));
  const web = () => appWith([], { webDir: folder }).app;

  test('the policy allows what the build wrote by its hash, and nothing inline besides', async () => {
    const policy = (await request(web()).get('/').expect(200)).headers['content-security-policy'] as string;
    expect(policy).toContain(`'sha256-${createHash('sha256').update(style).digest('base64')}'`);
    expect(policy).toContain("script-src 'self';");
    expect(policy).not.toContain('unsafe');
    expect(policy).toContain("frame-ancestors 'none'");
  });

  test('every address that is no file gets the one page; a missing bundle is not found, without a path in the words', async () => {
    expect((await request(web()).get('/runs/anything').expect(200)).text).toContain('id="root"');
    const missing = await request(web()).get('/_expo/static/js/gone.js').expect(404);
    expect(missing.text).not.toContain(folder);
  });

  test('what carries a hash of its content in its name is kept for ever, the page is not', async () => {
    expect((await request(web()).get('/_expo/static/js/entry-0123456789abcdef0123.js').expect(200)).headers['cache-control']).toContain(
      'immutable',
    );
    expect((await request(web()).get('/').expect(200)).headers['cache-control']).toBe('no-cache');
  });

  test('headers that a browser needs', async () => {
    const { headers } = await request(web()).get('/').expect(200);
    expect(headers).toMatchObject({ 'x-content-type-options': 'nosniff', 'referrer-policy': 'no-referrer' });
    expect(headers['strict-transport-security']).toBeUndefined();
    expect(headers['x-powered-by']).toBeUndefined();
    const overTls = await request(appWith([], { webDir: folder, publicUrl: 'https://balance.quillfen.example' }).app)
      .get('/')
      .expect(200);
    expect(overTls.headers['strict-transport-security']).toContain('max-age=31536000');
  });

  test('the log names the route and never what stands in an address, a header or a body', async () => {
    const { app, logged } = appWith([counting()]);
    await sent(request(app).post('/api/labs/lab/things?token=sesame')).set('Idempotency-Key', 'k').send({ word: 'opensesame' }).expect(201);
    const line = logged.find((text) => text.includes('answered')) ?? '';
    expect(JSON.parse(line)).toMatchObject({ method: 'POST', route: '/labs/:labId/things', status: 201 });
    expect(line).not.toContain('sesame');
    expect(line).not.toContain(member.token);
  });
});
