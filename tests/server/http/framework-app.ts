import { pino } from 'pino';
import request from 'supertest';
import * as z from 'zod';
import { VirtualClock } from '@/server/engine/virtual-clock';
import { createApp } from '@/server/http/create-app';
import { mount, type MountedRoute } from '@/server/http/route-context';
import { AnswerCounts } from '@/server/http/metrics';
import type { Services } from '@/server/http/services';
import type { IdempotencyAnswer, IdempotencyClaim, IdempotencyPort } from '@/server/interfaces/idempotency';
import type { ServerConfig } from '@/server/interfaces/server-config';
import { defineRoute } from '@/shared/contracts/route';
import { sha256, testConfig } from '@/tests/support/lab-server';

/** The framework alone: no database, the people and the keys of commands in memory. */

export const member = {
  userId: 'u1',
  name: 'Ilse Marrowby',
  email: 'ilse@quillfen.example',
  session: { id: 's', userId: 'u1', createdAt: new Date(0), authAt: new Date(0), expiresAt: new Date(1) },
  token: 't'.repeat(43),
};
export const cookie = `ef=${member.token}`;

class Keys implements IdempotencyPort {
  readonly kept = new Map<string, { claim: IdempotencyClaim; answer: IdempotencyAnswer | null }>();
  away = false;

  async begin(claim: IdempotencyClaim) {
    if (this.away) throw Object.assign(new Error('connect ECONNREFUSED'), { code: 'ECONNREFUSED' });
    const found = this.kept.get(claim.key);
    if (found === undefined) {
      this.kept.set(claim.key, { claim, answer: null });
      return { kind: 'new' as const };
    }
    if (found.claim.fingerprint !== claim.fingerprint) return { kind: 'other-request' as const };
    return found.answer === null ? { kind: 'running' as const } : { kind: 'answered' as const, answer: found.answer };
  }

  async finish(claim: IdempotencyClaim, answer: IdempotencyAnswer) {
    this.kept.set(claim.key, { claim, answer });
  }

  async release(claim: IdempotencyClaim) {
    this.kept.delete(claim.key);
  }
}

export function appWith(routes: readonly MountedRoute[], config: Partial<ServerConfig> = {}) {
  const keys = new Keys();
  const logged: string[] = [];
  const membership = { labId: 'lab', labName: 'Quillfen Gravity Laboratory', timeZone: 'Europe/Zurich', role: 'operator' as const };
  const services = {
    config: testConfig({ url: '' } as never, config),
    clock: new VirtualClock(0, () => Promise.resolve()),
    log: pino({ level: 'info' }, { write: (line: string) => void logged.push(line) }),
    newId: () => 'a-request',
    answers: new AnswerCounts(),
    sha256,
    databaseAwaySinceUtcMs: () => null,
    idempotency: keys,
    access: {
      signedIn: async (token: string) => (token === member.token ? member : null),
      membership: async (_: string, labId: string) => (labId === 'lab' ? membership : null),
      remembered: (token: string, labId: string) => (token === member.token && labId === 'lab' ? { me: member, membership } : null),
    },
  } as unknown as Services;
  return { app: createApp(services, routes), keys, logged };
}

export const sent = (test: request.Test) => test.set('Cookie', cookie).set('Sec-Fetch-Site', 'same-origin');

/** Routes of no lab: a command, an edit, a hold, a list, and something an operator may not. */
export const post = defineRoute({
  name: 'post',
  summary: '',
  method: 'POST',
  path: '/labs/:labId/things',
  access: 'protocol.write',
  status: 201,
  idempotent: true,
  body: z.strictObject({ word: z.string().min(2), deep: z.strictObject({ n: z.number() }).optional() }),
  response: z.strictObject({ word: z.string(), count: z.number() }),
  problems: [],
});
export const put = defineRoute({
  name: 'put',
  summary: '',
  method: 'PUT',
  path: '/labs/:labId/things/:id',
  access: 'protocol.write',
  status: 200,
  etag: 'required',
  body: z.strictObject({}),
  response: z.strictObject({ version: z.string() }),
  problems: [],
});
export const hold = defineRoute({
  name: 'hold',
  summary: '',
  method: 'POST',
  path: '/labs/:labId/hold',
  access: 'run.hold',
  status: 202,
  idempotent: true,
  body: z.strictObject({}),
  response: z.strictObject({ ok: z.boolean() }),
  problems: [],
});
export const list = defineRoute({
  name: 'list',
  summary: '',
  method: 'GET',
  path: '/labs/:labId/things',
  access: 'read',
  status: 200,
  query: z.strictObject({ cursor: z.string().optional(), limit: z.coerce.number().default(2) }),
  response: z.strictObject({ items: z.array(z.number()), next: z.string().nullable() }),
  problems: [],
});
export const edit = defineRoute({
  name: 'edit',
  summary: '',
  method: 'DELETE',
  path: '/labs/:labId/rig',
  access: 'rig.edit',
  status: 204,
  problems: [],
});

export function counting() {
  let count = 0;
  return mount(post, ({ body }) => ({ word: body.word, count: (count += 1) }));
}
