import type { BodyOf } from '@/shared/contracts/route';
import type { addPushDevice } from '@/shared/contracts/calls';

/** The browser's side of push messages (W3C Push API). */

/** Why this browser cannot take any, in a sentence; null where it can. */
export function whyNoPush(): string | null {
  if (!('serviceWorker' in navigator) || !('PushManager' in window) || !('Notification' in window))
    return window.isSecureContext
      ? 'This browser takes push messages only when the page is installed on the home screen, or not at all.'
      : 'Push messages need a page under https.';
  if (Notification.permission === 'denied')
    return 'This browser was told to take no messages of this page; its settings can allow them again.';
  return null;
}

/** By what a browser betrays its system and itself, the telling marks before those that many bear. */
const systems = {
  Android: 'Android',
  iPhone: 'iPhone',
  iPad: 'iPad',
  Windows: 'Windows',
  CrOS: 'ChromeOS',
  'Mac OS X': 'macOS',
  Linux: 'Linux',
};
const browsers = { 'Edg/': 'Edge', 'OPR/': 'Opera', 'Firefox/': 'Firefox', 'Chrome/': 'Chrome', 'Safari/': 'Safari' };

/** What the browser calls itself, short enough to be known again. */
export function deviceName(userAgent: string): string {
  const known = (marks: Readonly<Record<string, string>>, otherwise: string) =>
    Object.entries(marks).find(([mark]) => userAgent.includes(mark))?.[1] ?? otherwise;
  return `${known(browsers, 'Browser')} on ${known(systems, 'another system')}`;
}

const bytesOf = (base64url: string): Uint8Array<ArrayBuffer> => {
  const text = atob(base64url.replaceAll('-', '+').replaceAll('_', '/'));
  return Uint8Array.from(text, (character) => character.charCodeAt(0));
};

/** The browser would not; says what would be right. */
export class PushRefused extends Error {
  override readonly name = 'PushRefused';
}

/**
 * Asks for permission, which the browser grants on a tap only, and subscribes.
 * @throws PushRefused
 */
export async function subscribeHere(publicKey: string): Promise<BodyOf<typeof addPushDevice>> {
  if ((await Notification.requestPermission()) !== 'granted')
    throw new PushRefused('The browser was not allowed to show messages. Allow it when it asks, or in its settings.');
  const subscription = await subscribed(publicKey);
  const { endpoint, keys } = subscription.toJSON();
  const { p256dh = '', auth = '' } = keys ?? {};
  return { endpoint: endpoint ?? subscription.endpoint, keys: { p256dh, auth }, device: deviceName(navigator.userAgent) };
}

async function subscribed(publicKey: string): Promise<PushSubscription> {
  try {
    await navigator.serviceWorker.register('/service-worker.js', { updateViaCache: 'none' });
    const worker = await navigator.serviceWorker.ready;
    return await worker.pushManager.subscribe({ userVisibleOnly: true, applicationServerKey: bytesOf(publicKey) });
  } catch (error) {
    throw new PushRefused(
      `The browser did not subscribe: ${error instanceof Error ? error.message : String(error)}. Try again, or use another browser.`,
    );
  }
}
