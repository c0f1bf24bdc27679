import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { createContext, runInContext } from 'node:vm';
import * as fc from 'fast-check';
import { routes } from '@/shared/contracts';

/** public/service-worker.js as the build leaves it, in a world without a network of its own. */

const source = readFileSync(join(__dirname, '../../public/service-worker.js'), 'utf8');
const origin = 'https://lab.example';
const part = '/_expo/static/js/web/entry-0123456789abcdef0123456789abcdef.js';
const font = '/fonts/atkinson-hyperlegible-next-latin-wght-normal.woff2';
const files = [part, font];

type Asked = { method: string; mode: string; url: string };
type Answer = { status: number; of: string };

class World {
  readonly kept = new Map<string, Map<string, Answer>>();
  readonly fetched: string[] = [];
  readonly imported: string[] = [];
  answer: (url: string) => Promise<Answer> = (url) => Promise.resolve({ status: 200, of: `network ${url}` });
  private readonly listeners = new Map<string, (event: object) => void>();
  readonly routeOf: (asked: Asked, own: { origin: string; files: string[] }) => string | null;

  constructor(version = 'one') {
    const pathOf = (asked: string | { url: string }) => new URL(typeof asked === 'string' ? asked : asked.url, origin).pathname;
    const fetching = (asked: { url: string }) => {
      this.fetched.push(pathOf(asked));
      return this.answer(pathOf(asked));
    };
    const caches = {
      open: (name: string) => {
        const cache = this.kept.get(name) ?? new Map<string, Answer>();
        this.kept.set(name, cache);
        const addAll = async (all: { url: string }[]) => {
          for (const asked of all) cache.set(pathOf(asked), await fetching(asked));
        };
        return Promise.resolve({ addAll });
      },
      keys: () => Promise.resolve([...this.kept.keys()]),
      delete: (name: string) => Promise.resolve(this.kept.delete(name)),
      match: (asked: string, { cacheName }: { cacheName?: string } = {}) => {
        const where = [...this.kept].filter(([name]) => cacheName === undefined || name === cacheName);
        return Promise.resolve(where.map(([, cache]) => cache.get(pathOf(asked))).find((found) => found !== undefined));
      },
    };
    const self = {
      addEventListener: (type: string, listener: (event: object) => void) => this.listeners.set(type, listener),
      location: { origin },
      skipWaiting: () => Promise.resolve(),
    };
    const RequestLike = class {
      constructor(readonly url: string) {}
    };
    const context = createContext({
      ...{ self, caches, URL, clearTimeout, setTimeout, fetch: fetching },
      importScripts: (path: string) => void this.imported.push(path),
      ...{ Request: RequestLike, Response: { error: () => ({ status: 0, of: 'nothing' }) } },
    });
    const built = source.replace("{ version: 'unbuilt', files: [] }", JSON.stringify({ version, files }));
    this.routeOf = runInContext(`${built}\nrouteOf;`, context) as World['routeOf'];
  }

  async happens(type: 'install' | 'activate'): Promise<void> {
    let work: Promise<unknown> = Promise.resolve();
    this.listeners.get(type)?.({ waitUntil: (promise: Promise<unknown>) => (work = promise) });
    await work;
  }

  /** What the worker answers; null where it leaves the request to the browser. */
  async asks(path: string, { method = 'GET', mode = 'cors' } = {}): Promise<string | null> {
    let answer: Promise<Answer> | null = null;
    const request = { method, mode, url: new URL(path, origin).href };
    this.listeners.get('fetch')?.({ request, respondWith: (promise: Promise<Answer>) => (answer = promise) });
    return answer === null ? null : (await (answer as Promise<Answer>)).of;
  }
}

const away = () => Promise.reject(new TypeError('Failed to fetch'));

test('what shows push messages comes with it', () => {
  expect(new World().imported).toEqual(['/push-handler.js']);
});

test('no route of the API is ever touched, whatever its method, its words and the way it is asked', async () => {
  const world = new World();
  await world.happens('install');
  world.answer = away;
  for (const { path, method } of routes)
    for (const mode of ['cors', 'same-origin', 'navigate']) {
      expect(await world.asks(`/api${path}`, { method, mode })).toBeNull();
    }
});

test('nothing under /api and nothing but a GET is touched', () => {
  const { routeOf } = new World();
  const own = { origin, files };
  const modes = fc.constantFrom('navigate', 'cors', 'no-cors', 'same-origin');
  fc.assert(
    fc.property(fc.webPath(), fc.constantFrom('GET', 'POST', 'DELETE'), modes, (path, method, mode) => {
      expect(routeOf({ method, mode, url: `${origin}/api/${path}` }, own)).toBeNull();
      if (method !== 'GET') expect(routeOf({ method, mode, url: `${origin}${path}` }, own)).toBeNull();
    }),
    { numRuns: 50 },
  );
});

test.each([
  ['a page', 'GET', 'navigate', `${origin}/runs/17`, 'page'],
  ['a file of the build', 'GET', 'no-cors', `${origin}${part}`, 'part'],
  ['a file of an earlier build', 'GET', 'no-cors', `${origin}/_expo/static/js/web/entry-ff.js`, null],
  ['a file without its hash in the name', 'GET', 'no-cors', `${origin}/theme.js`, null],
  ['a live stream', 'GET', 'cors', `${origin}/api/labs/1/runs/2/live`, null],
  ['a stop', 'POST', 'cors', `${origin}/api/labs/1/runs/2/stop`, null],
  ['an archive opened as a page', 'GET', 'navigate', `${origin}/api/labs/1/runs/2/archive.zip`, null],
  ['a page whose name begins like the API', 'GET', 'navigate', `${origin}/apiary`, 'page'],
  ['another place', 'GET', 'cors', 'https://elsewhere.example/api', null],
])('%s', (_, method, mode, url, expected) => {
  expect(new World().routeOf({ method, mode, url }, { origin, files })).toBe(expected);
});

test('what is kept is the build and the offline page, and nothing is added later', async () => {
  const world = new World();
  await world.happens('install');
  const kept = () => [...(world.kept.get('evenfall-one')?.keys() ?? [])];
  expect(kept()).toEqual([...files, '/offline.html']);
  await world.asks('/runs/17', { mode: 'navigate' });
  await world.asks('/theme.js');
  expect(kept()).toEqual([...files, '/offline.html']);
});

test('a page comes from the network, and is the offline page where there is no answer or only that of a proxy', async () => {
  const world = new World();
  await world.happens('install');
  expect(await world.asks('/runs/17', { mode: 'navigate' })).toBe('network /runs/17');
  world.answer = () => Promise.resolve({ status: 502, of: 'the proxy' });
  expect(await world.asks('/runs/17', { mode: 'navigate' })).toBe('network /offline.html');
  world.answer = away;
  expect(await world.asks('/runs/17', { mode: 'navigate' })).toBe('network /offline.html');
});

test('a page that is not answered for 12 s is given up for the offline page', async () => {
  jest.useFakeTimers();
  const world = new World();
  await world.happens('install');
  world.answer = () => new Promise(() => undefined);
  const asked = world.asks('/runs/17', { mode: 'navigate' });
  await jest.advanceTimersByTimeAsync(12_000);
  expect(await asked).toBe('network /offline.html');
  jest.useRealTimers();
});

test('a file of the build comes from the device without a request', async () => {
  const world = new World();
  await world.happens('install');
  world.fetched.length = 0;
  world.answer = away;
  expect(await world.asks(part)).toBe(`network ${part}`);
  expect(world.fetched).toEqual([]);
});

test('the version before is kept for the pages that are open on it, older ones are not, and what others keep is left alone', async () => {
  const world = new World('three');
  for (const name of ['somebody-else', 'evenfall-one', 'evenfall-two']) world.kept.set(name, new Map());
  await world.happens('install');
  await world.happens('activate');
  expect([...world.kept.keys()]).toEqual(['somebody-else', 'evenfall-two', 'evenfall-three']);
});
