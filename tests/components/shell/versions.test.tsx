import { keepProgram, mayOffer } from '@/components/shell/versions';

/** A browser whose worker of a newer version comes when the test says so. */
function browser(controlled: boolean) {
  const messages: string[] = [];
  const container = Object.assign(new EventTarget(), { controller: controlled ? ({} as ServiceWorker) : null });
  const registration = Object.assign(new EventTarget(), {
    waiting: null as ServiceWorker | null,
    installing: null as ServiceWorker | null,
    update: jest.fn(() => Promise.resolve()),
  });
  const register = jest.fn(() => Promise.resolve(registration as unknown as ServiceWorkerRegistration));
  const reload = jest.fn();
  let look: () => void = () => undefined;
  const parts = {
    serviceWorker: Object.assign(container, { register }) as never,
    reload,
    nowAndThen: (again: () => void) => {
      look = again;
    },
  };
  const worker = Object.assign(new EventTarget(), { postMessage: (said: string) => void messages.push(said) }) as unknown as ServiceWorker;
  const comes = () => {
    registration.installing = worker;
    registration.dispatchEvent(new Event('updatefound'));
    registration.installing = null;
    registration.waiting = worker;
    worker.dispatchEvent(new Event('statechange'));
  };
  return { parts, registration, messages, reload, container, worker, comes, look: () => look() };
}

test('a newer version is told of when it is there, and nothing happens before somebody says so', async () => {
  const { parts, comes, messages, reload, container } = browser(true);
  const tell = jest.fn<void, [() => void]>();
  await keepProgram(parts, tell);
  expect(tell).not.toHaveBeenCalled();
  comes();
  expect(tell).toHaveBeenCalledTimes(1);
  expect([messages, reload.mock.calls]).toEqual([[], []]);
  tell.mock.calls[0]?.[0]();
  expect(messages).toEqual(['use-new-version']);
  expect(reload).not.toHaveBeenCalled();
  container.dispatchEvent(new Event('controllerchange'));
  expect(reload).toHaveBeenCalledTimes(1);
});

test('a version that another page goes over to does not load this one anew', async () => {
  const { parts, comes, container, reload } = browser(true);
  await keepProgram(parts, () => undefined);
  comes();
  container.dispatchEvent(new Event('controllerchange'));
  expect(reload).not.toHaveBeenCalled();
});

test('one that waits since an earlier visit is told of at once; the first visit tells of nothing', async () => {
  const waiting = browser(true);
  waiting.registration.waiting = waiting.worker;
  const tell = jest.fn();
  await keepProgram(waiting.parts, tell);
  expect(tell).toHaveBeenCalledTimes(1);
  const first = browser(false);
  await keepProgram(first.parts, tell);
  first.comes();
  expect(tell).toHaveBeenCalledTimes(1);
});

test('a newer version is looked for now and then; a network that is away is no error', async () => {
  const { parts, registration, look } = browser(true);
  registration.update.mockRejectedValueOnce(new TypeError('Failed to fetch'));
  await keepProgram(parts, () => undefined);
  look();
  look();
  expect(registration.update).toHaveBeenCalledTimes(2);
});

test.each([
  ['/rigs', true],
  ['/runs', true],
  ['/lab', true],
  ['/', true],
  ['/runs/7b7e', false],
  ['/rigs/7b7e/start', false],
  ['/rigs/7b7e/first-move', false],
  ['/protocols/7b7e', false],
  ['/protocols/new', false],
])('at %s it is offered: %s', (pathname, offered) => expect(mayOffer(pathname)).toBe(offered));
