import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { runInNewContext } from 'node:vm';
import { fireEvent, screen, waitFor } from '@testing-library/react';
import { PushDevices } from '@/components/lab/push-devices';
import { deviceName } from '@/components/lab/push-subscription';
import { showInLab, startFakeLab } from '../support/fake-lab';

/** The browser's side of push messages, with a subscription that leads nowhere. */

const endpoint = 'https://push.example/message/1';
const keys = { p256dh: 'B'.repeat(87), auth: 'A'.repeat(22) };
const subscribe = jest.fn(async () => ({ endpoint, toJSON: () => ({ endpoint, keys }) }));
const requestPermission = jest.fn(async () => 'granted');

beforeEach(() => {
  const registration = { pushManager: { subscribe } };
  const serviceWorker = { register: jest.fn(async () => registration), ready: Promise.resolve(registration) };
  Object.defineProperty(navigator, 'serviceWorker', { value: serviceWorker, configurable: true });
  Object.assign(window, { PushManager: class {}, Notification: { permission: 'default', requestPermission } });
});

async function open() {
  const lab = startFakeLab('operator');
  const devices: object[] = [];
  lab.on('GET /push/subscriptions', () => ({ body: { items: devices } }));
  lab.on('GET /push/key', () => ({ body: { publicKey: 'BAEC' } }));
  lab.on('POST /push/subscriptions', ({ body }) => {
    const device = { id: 'd1', device: (body as { device: string }).device, madeAt: '2031-03-14T20:00:00Z', lastSentAt: null };
    devices.push(device);
    return { status: 201, body: device };
  });
  await showInLab(<PushDevices />);
  return lab;
}

test('one tap asks, subscribes with the key of the server and hands the subscription over', async () => {
  const lab = await open();
  fireEvent.click(await screen.findByTestId('add-push'));
  await screen.findByText(deviceName(navigator.userAgent));
  expect(subscribe).toHaveBeenCalledWith({ userVisibleOnly: true, applicationServerKey: Uint8Array.from([4, 1, 2]) });
  expect(lab.requests('POST /push/subscriptions')[0]?.body).toEqual({ endpoint, keys, device: deviceName(navigator.userAgent) });
});

test('whoever refuses is told how to allow it, and nothing is sent', async () => {
  requestPermission.mockResolvedValueOnce('denied');
  const lab = await open();
  fireEvent.click(await screen.findByTestId('add-push'));
  await screen.findByText(/The browser was not allowed to show messages/);
  expect(lab.requests('POST /push/subscriptions')).toEqual([]);
});

test('a browser is named so that its owner knows it again', () => {
  expect(deviceName('Mozilla/5.0 (Linux; Android 14) AppleWebKit/537.36 (KHTML, like Gecko) Chrome/156.0 Mobile Safari/537.36')).toBe(
    'Chrome on Android',
  );
  expect(deviceName('Mozilla/5.0 (iPhone; CPU iPhone OS 18_0 like Mac OS X) AppleWebKit/605 Version/18 Mobile Safari/604')).toBe(
    'Safari on iPhone',
  );
  expect(deviceName('something else')).toBe('Browser on another system');
});

describe('the handler of the service worker', () => {
  type Listener = (event: object) => void;
  const shown: { title: string; options: Record<string, unknown> }[] = [];
  const opened: string[] = [];
  const listeners = new Map<string, Listener>();
  const page = { focus: jest.fn(async () => undefined), navigate: jest.fn(async () => undefined) };
  let pages: object[] = [];
  const self = {
    location: { origin: 'https://balance.quillfen.example' },
    addEventListener: (kind: string, listener: Listener) => void listeners.set(kind, listener),
    registration: { showNotification: async (title: string, options: Record<string, unknown>) => void shown.push({ title, options }) },
    clients: { matchAll: async () => pages, openWindow: async (url: string) => void opened.push(url) },
  };
  runInNewContext(readFileSync(join(__dirname, '../../../public/push-handler.js'), 'utf8'), { self, URL });

  async function happens(kind: string, event: object): Promise<void> {
    let work: Promise<unknown> = Promise.resolve();
    listeners.get(kind)?.({ ...event, waitUntil: (promise: Promise<unknown>) => (work = promise) });
    await work;
  }

  test('shows what the server said; a quiet message makes no sound', async () => {
    const message = { title: 'Interlock or door opened: North bench', body: '21:03', path: '/alarms/1', tag: 'alarm-1', quiet: false };
    await happens('push', { data: { json: () => message } });
    await happens('push', { data: { json: () => ({ ...message, quiet: true }) } });
    expect(shown).toMatchObject([
      { title: message.title, options: { body: '21:03', tag: 'alarm-1', silent: false, requireInteraction: true } },
      { options: { silent: true, renotify: false } },
    ]);
  });

  test('a tap leads an open page there, or opens one; never to another place', async () => {
    const tap = (path: string) => happens('notificationclick', { notification: { close: () => undefined, data: { path } } });
    await tap('/alarms/1');
    expect(opened).toEqual(['https://balance.quillfen.example/alarms/1']);
    pages = [page];
    await tap('/alarms/2');
    expect(page.navigate).toHaveBeenCalledWith('https://balance.quillfen.example/alarms/2');
    await tap('https://elsewhere.example/');
    expect(opened).toHaveLength(1);
    await waitFor(() => expect(page.navigate).toHaveBeenCalledTimes(1));
  });
});
