import { QueryClient, QueryClientProvider } from '@tanstack/react-query';
import { act, render } from '@testing-library/react';
import type { ReactNode } from 'react';
import { SessionProvider } from '@/components/api/session';
import { ToastProvider } from '@/components/ui';
import type { Me } from '@/shared/contracts/people';
import type { Role } from '@/shared/contracts/roles';

/** A server in the page's own memory: answers by method and path, and remembers what it was asked. Nothing leaves the test. */

export interface Asked {
  method: string;
  path: string;
  body: unknown;
  headers: Headers;
}
export interface Answer {
  status?: number;
  body?: unknown;
  etag?: string;
}
type Handler = (asked: Asked) => Answer;

const labId = 'lab-1';
export const memberAs = (role: Role): Me => ({
  user: { id: 'u1', name: 'Ada Thornfield', email: 'ada@quillfen.example' },
  memberships: [{ labId, labName: 'Quillfen Gravity Laboratory', timeZone: 'Europe/Oslo', role }],
  sessionExpiresAt: '2031-03-20T00:00:00Z',
});

/** The answer that refuses, as RFC 9457 has it; status, code, sentence and, where a field is meant, its errors. */
export const problem = (
  status: number,
  code: string,
  refusal: string | { detail: string; errors: { path: string; message: string }[] },
): Answer => ({
  status,
  body: { type: `/problems/${code}`, title: code, status, code, ...(typeof refusal === 'string' ? { detail: refusal } : refusal) },
});

export interface FakeLab {
  asked: Asked[];
  /** Answers of `METHOD /path`; the newest of a name counts. */
  on: (name: string, handler: Handler) => void;
  /** While true every request fails as on a dead network. */
  away: boolean;
  requests: (name: string) => Asked[];
}

/** Puts a server in the place of the network for one test. */
export function startFakeLab(role: Role): FakeLab {
  const handlers = new Map<string, Handler>();
  const asked: Asked[] = [];
  const lab: FakeLab = {
    asked,
    away: false,
    on: (name, handler) => void handlers.set(name, handler),
    requests: (name) => asked.filter(({ method, path }) => `${method} ${path}` === name),
  };
  lab.on('GET /session', () => ({ body: memberAs(role) }));
  globalThis.fetch = (async (address: string, init: RequestInit = {}) => {
    if (lab.away) throw new TypeError('Failed to fetch');
    const path = address.replace(/^\/api/, '').replace(/\?.*$/, '');
    const request = {
      method: init.method ?? 'GET',
      path,
      body: typeof init.body === 'string' ? (JSON.parse(init.body) as unknown) : undefined,
      headers: new Headers(init.headers),
    };
    asked.push(request);
    const {
      body,
      status = body === undefined ? 204 : 200,
      etag,
    } = handlers.get(`${request.method} ${path}`)?.(request) ?? problem(404, 'not-found', `Nothing at ${path}.`);
    return {
      ok: status < 300,
      status,
      headers: new Headers(etag === undefined ? {} : { etag }),
      json: () => Promise.resolve(body),
    } as Response;
  }) as typeof fetch;
  return lab;
}

/** Shows a part of the application to a signed-in member. */
export async function showInLab(page: ReactNode) {
  const queries = new QueryClient({
    defaultOptions: { queries: { retry: false, networkMode: 'always' }, mutations: { networkMode: 'always' } },
  });
  const view = render(
    <QueryClientProvider client={queries}>
      <SessionProvider>
        <ToastProvider>{page}</ToastProvider>
      </SessionProvider>
    </QueryClientProvider>,
  );
  await settled();
  return view;
}

/** Lets answers of the fake server arrive and the page draw them. */
export async function settled(): Promise<void> {
  for (let turn = 0; turn < 6; turn += 1) await act(async () => Promise.resolve());
}
