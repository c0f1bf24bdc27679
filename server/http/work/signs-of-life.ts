import { reportCondition } from '../../store/alarms';
import { noteSign, watcherOf, watchers, type Watcher } from '../../store/calls';
import type { Services } from '../services';

/** A dead server tells nobody that it is dead: an outside watcher of the lab's choice hears each minute that it lives. */

/** Sends each lab's sign, all at once: a watcher that hangs keeps no other waiting. */
export async function sendSigns(services: Services): Promise<void> {
  await Promise.all((await watchers(services.database.db)).map((watcher) => sendSign(services, watcher)));
}

/** Sends one sign and notes what became of it. */
export async function sendSign(services: Services, watcher: Watcher): Promise<void> {
  const { db } = services.database;
  const { ok, detail } = await answerOf(services, watcher.url);
  const utcMs = services.clock.utcMs();
  await noteSign(db, watcher, { at: utcMs, ok, detail });
  const { signFailingSince } = await watcherOf(db, watcher.labId);
  const place = { labId: watcher.labId, rigId: null, code: 'sign-of-life-failed' as const, subject: '' };
  const words = `${new URL(watcher.url).host}: ${detail}`;
  await db.transaction((tx) => reportCondition(tx, place, { met: !ok, words, runId: null, sinceUtcMs: signFailingSince ?? utcMs, utcMs }));
}

async function answerOf({ outgoing }: Services, url: string): Promise<{ ok: boolean; detail: string }> {
  try {
    const { status } = await outgoing.send({ url, method: 'GET' });
    const ok = status >= 200 && status < 300;
    return { ok, detail: ok ? `taken, it answered ${String(status)}` : `it answered ${String(status)}` };
  } catch (error) {
    return { ok: false, detail: error instanceof Error ? error.message : String(error) };
  }
}
