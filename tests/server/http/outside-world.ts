import type { BuildOverrides } from '@/server/boot/build-parts';
import type { Mail } from '@/server/interfaces/mail';
import type { PushMessage } from '@/server/interfaces/push';

/** Mail, push service and watcher as the tests of alarms see them: what came, and how each answers. */
export function outsideWorld() {
  const mails: Mail[] = [];
  const pushes: { to: string; message: PushMessage }[] = [];
  const watcher = { status: 200, asked: [] as string[] };
  const world = { mails, pushes, watcher, mailWorks: true };
  const overrides: BuildOverrides = {
    mail: {
      send: async (mail) => {
        if (!world.mailWorks) throw new Error('550 mailbox unavailable');
        mails.push(mail);
      },
    },
    push: {
      publicKey: async () => 'BPublic',
      send: async ({ endpoint }, message) => {
        if (endpoint.endsWith('gone')) return 'gone';
        pushes.push({ to: endpoint, message });
        return 'sent';
      },
    },
    outgoing: {
      send: async ({ url }) => {
        watcher.asked.push(url);
        return { status: watcher.status };
      },
    },
  };
  return Object.assign(world, { overrides });
}
