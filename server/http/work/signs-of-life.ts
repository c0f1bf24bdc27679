import { reportCondition } from '../../store/alarms';
import { noteSign, watcherOf, watchers, type Watcher } from '../../store/calls';
import type { Services } from '../services';
import { heedLeftRigs } from './left-rigs';

/**
 * A dead server tells nobody that it is dead: an outside watcher of the lab's choice hears each minute that it lives. While nobody drives a rig that
 * somebody counts on, the lab sends no sign.
 */

/** Sends each lab's sign, all at once: a watcher that hangs keeps no other waiting. */
export async function sendSigns(services: Services): Promise<void> {
  const left = await heedLeftRigs(services);
  await Promise.all(
    (await watchers(services.database.db)).map((watcher) => {
      const why = left.get(watcher.labId);
      return why === undefined ? sendSign(services, watcher) : withhold(services, watcher, why);
    }),
  );
}

const withhold = ({ database, clock }: Services, watcher: Watcher, why: string): Promise<void> =>
  noteSign(database.db, watcher, { at: clock.utcMs(), ok: false, detail: `not sent: ${why}` });

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
