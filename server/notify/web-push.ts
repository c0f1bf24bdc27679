import webPush from 'web-push';
import type { OutgoingPort } from '../interfaces/outgoing';
import type { PushPort } from '../interfaces/push';
import type { Database } from '../store/database';
import { sharedSecret } from '../store/secrets';

interface PushParts {
  db: Database;
  outgoing: OutgoingPort;
  /** Where a push service may complain: an https or mailto address. */
  subject: string;
  nowUtcMs(): number;
}

/** A message that nobody took in this time is of no use any more, s. */
const lastsS = 4 * 3600;

/** Push messages after RFC 8030, encrypted after RFC 8291, signed after RFC 8292; the key is made once for all server processes. */
export function createWebPush({ db, outgoing, subject, nowUtcMs }: PushParts): PushPort {
  let known: webPush.VapidKeys | null = null;
  // Kept in memory: messages go out while the database is away.
  const keys = async () =>
    (known ??= await sharedSecret(db, { name: 'vapid', make: () => webPush.generateVAPIDKeys(), nowUtcMs: nowUtcMs() }));
  return {
    publicKey: async () => (await keys()).publicKey,
    send: async ({ endpoint, p256dh, auth }, message) => {
      const details = webPush.generateRequestDetails({ endpoint, keys: { p256dh, auth } }, JSON.stringify(message), {
        vapidDetails: { subject, ...(await keys()) },
        TTL: lastsS,
        urgency: message.quiet ? 'normal' : 'high',
        contentEncoding: 'aes128gcm',
      });
      const headers = Object.fromEntries(Object.entries(details.headers).map(([name, value]) => [name, String(value)]));
      const { status } = await outgoing.send({ url: endpoint, method: 'POST', headers, body: details.body });
      if (status === 404 || status === 410) return 'gone';
      if (status < 200 || status > 299) throw new Error(`the push service answered ${String(status)}`);
      return 'sent';
    },
  };
}
