import * as z from 'zod';
import { addressOf, call, newIdempotencyKey, onSignInRefused } from '@/components/api/client';
import { currentConnection } from '@/components/api/connection';
import { ApiProblem, ApiUnreachable, fieldErrors, wordsOf } from '@/components/api/problem';
import { defineRoute } from '@/shared/contracts/route';

const read = defineRoute({
  name: 'read',
  summary: '',
  method: 'GET',
  path: '/labs/:labId/things/:thingId',
  access: 'read',
  status: 200,
  response: z.strictObject({ name: z.string() }),
  query: z.strictObject({ from: z.string().optional() }),
  problems: [],
});
const act = defineRoute({
  name: 'act',
  summary: '',
  method: 'POST',
  path: '/labs/:labId/acts',
  access: 'run.start',
  status: 201,
  idempotent: true,
  body: z.strictObject({ n: z.number() }),
  response: z.strictObject({ ok: z.boolean() }),
  problems: [],
});
const remove = defineRoute({
  name: 'remove',
  summary: '',
  method: 'DELETE',
  path: '/labs/:labId',
  access: 'run.start',
  status: 204,
  problems: [],
});
const params = { labId: 'lab 1', thingId: 'a/b' };

const answers = (status: number, body: unknown, headers: Record<string, string> = {}) =>
  jest.fn(
    async (_address: string, _init: RequestInit) => new Response(body === undefined ? null : JSON.stringify(body), { status, headers }),
  );
const problem = (status: number, code: string, more: object = {}) => ({
  type: `/problems/${code}`,
  title: code,
  status,
  code,
  detail: 'What is wrong and what would be right.',
  ...more,
});

let fetched: ReturnType<typeof answers>;
const respond = (mock: ReturnType<typeof answers>) => {
  fetched = mock;
  globalThis.fetch = mock as unknown as typeof fetch;
};
const realFetch = globalThis.fetch;
afterEach(() => {
  globalThis.fetch = realFetch;
});
const sentHeaders = () => new Headers(fetched.mock.calls[0]?.[1].headers);

test('parameters and query are encoded into the address', () => {
  expect(addressOf(read, { params, query: { from: 'x&y', none: undefined } })).toBe('/api/labs/lab%201/things/a%2Fb?from=x%26y');
});

test('a missing parameter is an error of the program, not a request', () => {
  expect(() => addressOf(read, { params: { labId: 'a' } })).toThrow('needs the parameter thingId');
});

test('body and ETag of an answer come back together', async () => {
  respond(answers(200, { name: 'North bench' }, { etag: '"7"' }));
  await expect(call(read, { params })).resolves.toEqual({ data: { name: 'North bench' }, etag: '"7"' });
});

test('a command carries a key of its own, or the one it was given', async () => {
  respond(answers(201, { ok: true }));
  await call(act, { params: { labId: 'a' }, body: { n: 1 } });
  expect(sentHeaders().get('idempotency-key')).toMatch(/^[0-9a-f]{32}$/);
  respond(answers(201, { ok: true }));
  await call(act, { params: { labId: 'a' }, body: { n: 1 }, idempotencyKey: 'tap-1' });
  expect(sentHeaders().get('idempotency-key')).toBe('tap-1');
  expect(newIdempotencyKey()).not.toBe(newIdempotencyKey());
});

test('an edit says which version it is based on', async () => {
  respond(answers(200, { name: 'x' }));
  await call(read, { params, ifMatch: '"3"' });
  expect(sentHeaders().get('if-match')).toBe('"3"');
});

test('a problem comes as its code, its sentence and its fields', async () => {
  respond(
    answers(
      400,
      problem(400, 'invalid-input', {
        errors: [
          { path: 'email', message: 'an address' },
          { path: 'email', message: 'second' },
        ],
      }),
    ),
  );
  const error = await call(read, { params }).catch((caught: unknown) => caught);
  expect(error).toBeInstanceOf(ApiProblem);
  expect(error).toMatchObject({ code: 'invalid-input', status: 400 });
  expect(fieldErrors(error)).toEqual({ email: 'an address' });
  expect(wordsOf(error).detail).toBe('What is wrong and what would be right.');
});

test('an answer that is no problem document is still a sentence', async () => {
  respond(answers(502, '<html>'));
  await expect(call(read, { params })).rejects.toMatchObject({ code: 'internal', detail: expect.stringContaining('502') });
});

test('an answer of another version asks for a reload instead of showing half', async () => {
  respond(answers(200, { name: 1 }));
  await expect(call(read, { params })).rejects.toMatchObject({ detail: expect.stringContaining('Reload') });
});

test('the sign-in page of a network is not taken for an answer, not even where none has a body', async () => {
  respond(answers(200, '<html>'));
  for (const asked of [call(remove, { params }), call(read, { params }), call(act, { params, body: { n: 1 } })])
    await expect(asked).rejects.toMatchObject({ detail: expect.stringContaining('sign in to the network') });
  respond(answers(204, undefined));
  await expect(call(remove, { params })).resolves.toMatchObject({ data: undefined });
});

test('a server that does not answer is unreachable until it answers again, and nothing is sent twice', async () => {
  const silent = jest.fn(async () => Promise.reject(new TypeError('Failed to fetch')));
  respond(silent as unknown as ReturnType<typeof answers>);
  await expect(call(act, { params: { labId: 'a' }, body: { n: 1 } })).rejects.toBeInstanceOf(ApiUnreachable);
  expect(silent).toHaveBeenCalledTimes(1);
  expect(currentConnection().online).toBe(false);
  respond(answers(200, { name: 'x' }));
  await call(read, { params });
  expect(currentConnection().online).toBe(true);
});

test.each([
  ['session-expired', 1],
  ['not-signed-in', 1],
  ['wrong-credentials', 0],
  ['not-allowed', 0],
])('%s tells the page %d times that nobody is signed in', async (code, times) => {
  const heard = jest.fn();
  const stop = onSignInRefused(heard);
  respond(answers(401, problem(401, code)));
  await call(read, { params }).catch(() => undefined);
  stop();
  expect(heard).toHaveBeenCalledTimes(times);
});
