import request from 'supertest';
import { problemErrorOf } from '@/server/http/errors';
import { mount } from '@/server/http/route-context';
import { problemSchema } from '@/shared/contracts/problem';
import { appWith, cookie, counting, edit, hold, list, member, post, put, sent } from './framework-app';

describe('problems', () => {
  test('a body that does not fit names each place and what would be right', async () => {
    const { app } = appWith([counting()]);
    const answer = await sent(request(app).post('/api/labs/lab/things'))
      .set('Idempotency-Key', 'k')
      .send({ word: 'x', deep: { n: 'one' }, isOwner: true })
      .expect(400);
    expect(answer.headers['content-type']).toBe('application/problem+json; charset=utf-8');
    expect(problemSchema.parse(answer.body)).toMatchObject({
      type: '/problems/invalid-input',
      code: 'invalid-input',
      status: 400,
      instance: 'urn:uuid:a-request',
    });
    expect(answer.body.errors.map(({ path }: { path: string }) => path)).toEqual(['word', 'deep.n', 'isOwner']);
  });

  test('a body that is no JSON, of another type, or too large', async () => {
    const { app } = appWith([counting()], {
      limits: { requestsPerMinute: 1000, interventionsPerMinute: 1000, jsonBytes: 200, importBytes: 1, streamsPerUser: 1 },
    });
    const ask = () => sent(request(app).post('/api/labs/lab/things')).set('Idempotency-Key', 'k');
    expect((await ask().set('Content-Type', 'application/json').send('{"word":').expect(400)).body.detail).toBe(
      'The body of the request is not JSON.',
    );
    expect((await ask().set('Content-Type', 'text/plain').send('word').expect(415)).body).toMatchObject({
      code: 'wrong-content-type',
      detail: 'This route takes application/json; the request said text/plain.',
    });
    expect(
      (
        await ask()
          .send({ word: 'x'.repeat(300) })
          .expect(413)
      ).body.code,
    ).toBe('too-large');
  });

  test('nothing of the inside comes out when something unforeseen happens; it stands in the log under the same number', async () => {
    const secret = 'password is swordfish at /srv/app/x.ts';
    const { app, logged } = appWith([mount(list, () => Promise.reject(new Error(secret)))]);
    const answer = await sent(request(app).get('/api/labs/lab/things')).expect(500);
    expect(answer.text).not.toContain('swordfish');
    expect(answer.text).not.toContain('.ts');
    expect(answer.body.instance).toBe('urn:uuid:a-request');
    expect(logged.some((line) => line.includes('swordfish') && line.includes('a-request'))).toBe(true);
  });

  test.each([['ECONNREFUSED'], ['ECONNRESET'], ['57P01'], ['08006'], ['53300']])(
    'a database that answers %s is away, however deep the error lies',
    (code) => {
      const inner = Object.assign(new Error('x'), { code });
      expect(problemErrorOf(new Error('failed query', { cause: new AggregateError([inner]) })).code).toBe('database-away');
    },
  );

  test('a file that is missing is no database that is away', () => {
    expect(problemErrorOf(Object.assign(new Error('x'), { code: 'ENOENT', syscall: 'open' })).code).toBe('internal');
  });

  test('an answer that differs from its contract is an error in development and loses what is unknown in production', async () => {
    const leaky = mount(list, () => ({ items: [1], next: null, passwordHash: 'x' }) as never);
    await sent(request(appWith([leaky]).app).get('/api/labs/lab/things')).expect(500);
    const answer = await sent(request(appWith([leaky], { mode: 'production' }).app).get('/api/labs/lab/things')).expect(200);
    expect(answer.body).toEqual({ items: [1], next: null });
  });

  test('unknown routes of the API and the pages of the codes', async () => {
    const { app } = appWith([]);
    expect((await request(app).get('/api/nothing').expect(404)).body.code).toBe('not-found');
    expect((await request(app).get('/problems/rig-busy').expect(200)).text).toContain('The rig is busy');
  });
});

describe('who may', () => {
  test('nobody signed in, a session that ended, a strange lab, a role that may not', async () => {
    const { app } = appWith([counting(), mount(edit, () => undefined)]);
    const ask = (path: string) => request(app).delete(path).set('Sec-Fetch-Site', 'same-origin');
    expect((await ask('/api/labs/lab/rig').expect(401)).body.code).toBe('not-signed-in');
    expect(
      (
        await ask('/api/labs/lab/rig')
          .set('Cookie', `ef=${'z'.repeat(43)}`)
          .expect(401)
      ).body.code,
    ).toBe('session-expired');
    expect((await ask('/api/labs/other/rig').set('Cookie', cookie).expect(404)).body.code).toBe('not-found');
    expect((await ask('/api/labs/lab/rig').set('Cookie', cookie).expect(403)).body.detail).toBe(
      'Your role in Quillfen Gravity Laboratory is operator; this needs owner or keeper.',
    );
  });

  test.each([
    ['same-origin by Sec-Fetch-Site', { 'sec-fetch-site': 'same-origin' }, 201],
    ['cross-site', { 'sec-fetch-site': 'cross-site', origin: 'http://127.0.0.1' }, 403],
    ['same-site is not the same origin', { 'sec-fetch-site': 'same-site' }, 403],
    ['our own Origin where the browser names no relation', { host: 'bench.example', origin: 'http://bench.example' }, 201],
    ['a foreign Origin', { host: 'bench.example', origin: 'http://evil.example' }, 403],
    ['another scheme', { host: 'bench.example', origin: 'https://bench.example' }, 403],
    ['neither', {}, 403],
  ])('a change from %s', async (_, headers, status) => {
    const answer = await request(appWith([counting()]).app)
      .post('/api/labs/lab/things')
      .set('Cookie', cookie)
      .set('Idempotency-Key', 'k')
      .set(headers)
      .send({ word: 'ab' });
    expect(answer.status).toBe(status);
    if (status === 403) expect(answer.body.code).toBe('cross-site');
  });

  test('behind a proxy the public address counts', async () => {
    const { app } = appWith([counting()], { publicUrl: 'https://balance.quillfen.example' });
    const ask = (origin: string) =>
      request(app)
        .post('/api/labs/lab/things')
        .set('Cookie', `__Host-ef=${member.token}`)
        .set('Idempotency-Key', origin)
        .set('Origin', origin)
        .send({ word: 'ab' });
    await ask('https://balance.quillfen.example').expect(201);
    await ask('http://127.0.0.1').expect(403);
  });
});

describe('commands', () => {
  const command = (app: ReturnType<typeof appWith>['app'], key: string | null, body: object = { word: 'ab' }) => {
    const test = sent(request(app).post('/api/labs/lab/things'));
    return (key === null ? test : test.set('Idempotency-Key', key)).send(body);
  };

  test('need a key', async () => {
    expect((await command(appWith([counting()]).app, null).expect(400)).body.detail).toContain('Idempotency-Key');
  });

  test('repeated with the same key act once and give the first answer', async () => {
    const { app } = appWith([counting()]);
    expect((await command(app, 'k').expect(201)).body.count).toBe(1);
    expect((await command(app, '"k"').expect(201)).body.count).toBe(1);
    expect((await command(app, 'l').expect(201)).body.count).toBe(2);
  });

  test('with a used key and another body are refused', async () => {
    const { app } = appWith([counting()]);
    await command(app, 'k').expect(201);
    expect((await command(app, 'k', { word: 'cd' }).expect(422)).body.code).toBe('key-reused');
  });

  test('with a key whose first request still runs have to wait', async () => {
    let finish: (() => void) | undefined;
    const slow = mount(post, async ({ body }) => {
      await new Promise<void>((resolve) => {
        finish = resolve;
      });
      return { word: body.word, count: 1 };
    });
    const { app, keys } = appWith([slow]);
    const first = command(app, 'k').then((answer) => answer.status);
    while (keys.kept.get('k') === undefined || finish === undefined) await new Promise((resolve) => void setImmediate(resolve));
    expect((await command(app, 'k').expect(409)).body.code).toBe('still-running');
    finish();
    expect(await first).toBe(201);
  });

  test('a refusal is kept like any answer; a failure on our side gives the key back', async () => {
    let broken = true;
    const sometimes = mount(post, ({ body }) => {
      if (broken) throw new Error('a fault');
      return { word: body.word, count: 1 };
    });
    const { app } = appWith([sometimes]);
    await command(app, 'k').expect(500);
    broken = false;
    await command(app, 'k').expect(201);
  });

  test('hold works though the table of keys is out of reach, and a repeat acts once', async () => {
    let count = 0;
    const { app, keys } = appWith([mount(hold, () => ({ ok: (count += 1) > 0 })), counting()]);
    keys.away = true;
    for (let repeat = 0; repeat < 3; repeat += 1)
      await sent(request(app).post('/api/labs/lab/hold')).set('Idempotency-Key', 'k').send({}).expect(202);
    expect(count).toBe(1);
    expect((await command(app, 'k').expect(503)).body.code).toBe('database-away');
  });

  test('hold has a bucket of its own that nothing else can use up', async () => {
    const { app } = appWith([mount(hold, () => ({ ok: true })), counting()], {
      limits: { requestsPerMinute: 3, interventionsPerMinute: 10, jsonBytes: 1000, importBytes: 1, streamsPerUser: 1 },
    });
    for (let n = 0; n < 3; n += 1) await command(app, `k${String(n)}`).expect(201);
    expect((await command(app, 'k9').expect(429)).body.code).toBe('too-many-requests');
    await sent(request(app).post('/api/labs/lab/hold')).set('Idempotency-Key', 'h').send({}).expect(202);
  });
});

describe('versions and pages', () => {
  test('an edit must name its version; the ETag is the version of the answer', async () => {
    const { app } = appWith([
      mount(put, ({ ifMatch, setEtag }) => {
        setEtag('8');
        return { version: ifMatch ?? '' };
      }),
    ]);
    const ask = () => sent(request(app).put('/api/labs/lab/things/1')).send({});
    expect((await ask().expect(428)).body.code).toBe('precondition-required');
    const answer = await ask().set('If-Match', '"7"').expect(200);
    expect(answer.body.version).toBe('7');
    expect(answer.headers.etag).toBe('"8"');
  });

  test('a page links to the next one (RFC 8288) with the rest of the query kept', async () => {
    const { app } = appWith([mount(list, ({ query }) => ({ items: [1, 2], next: query.cursor === undefined ? 'abc' : null }))]);
    const first = await sent(request(app).get('/api/labs/lab/things?limit=2')).expect(200);
    expect(first.headers.link).toBe('</api/labs/lab/things?limit=2&cursor=abc>; rel="next"');
    expect((await sent(request(app).get('/api/labs/lab/things?limit=2&cursor=abc')).expect(200)).headers.link).toBeUndefined();
  });
});
