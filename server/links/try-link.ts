import { CAPABILITY, decodeLine, encode, NO_SESSION, type HiBody, type Reply } from '@/firmware-protocol/codec';
import type { ByteLine, ByteLineFactory } from '../interfaces/byte-line';
import type { Clock } from '../interfaces/clock';
import { silence, versionRefusal } from './link-words';

export interface Trial {
  ok: boolean;
  /** What answered, or what is wrong and what would be right, in words. */
  detail: string;
  firmware: string | null;
}

const ATTEMPTS = 4;
const ANSWER_MS = 800;
const INPUTS: [number, string][] = [
  [CAPABILITY.homeFlag, 'home flag'],
  [CAPABILITY.interlock, 'interlock'],
  [CAPABILITY.supply, 'supply contact'],
  [CAPABILITY.armKey, 'arm key'],
  [CAPABILITY.warning, 'warning output'],
];

/**
 * Opens a line, asks who is there and closes it again. The question changes nothing in the controller and moves nothing
 * (SPEC 4, `ident`), and every version answers it alike (SPEC 5.7). Never rejects.
 */
export async function tryLink({ factory, clock }: { factory: ByteLineFactory; clock: Clock }): Promise<Trial> {
  let dropped = 0;
  let heard: (reply: Reply | null) => void = () => undefined;
  let line: ByteLine | null = null;
  try {
    line = await factory.open({
      onLine: (text) => {
        const item = decodeLine(text);
        if (item.kind === 'reply') heard(item);
        else if (item.kind !== 'blank' && item.kind !== 'event') dropped += 1;
      },
      onClosed: () => heard(null),
    });
    line.write('\n');
    for (let number = 1; number <= ATTEMPTS; number += 1) {
      const hi = await ask(line, number);
      if (hi !== null) return told(hi);
    }
    return { ok: false, detail: silence(factory.description, dropped, false), firmware: null };
  } catch (error) {
    return { ok: false, detail: error instanceof Error ? error.message : String(error), firmware: null };
  } finally {
    await line?.close();
  }

  function ask(open: ByteLine, number: number): Promise<{ body: HiBody; roundTripMs: number; atUs: number } | null> {
    const sentMs = clock.monotonicMs();
    return new Promise((done) => {
      const cancel = clock.after(ANSWER_MS, () => done(null));
      heard = (reply) => {
        if (reply !== null && (reply.body.word !== 'hi' || reply.number !== number)) return;
        cancel();
        const hi = reply?.body.word === 'hi' ? reply.body : null;
        done(reply === null || hi === null ? null : { body: hi, roundTripMs: clock.monotonicMs() - sentMs, atUs: reply.receivedUs });
      };
      open.write(encode({ kind: 'request', epoch: 0, session: NO_SESSION, number, order: { word: 'ident' } }));
    });
  }

  function told({ body, roundTripMs, atUs }: { body: HiBody; roundTripMs: number; atUs: number }): Trial {
    const why = versionRefusal(body);
    if (why !== null) return { ok: false, detail: why, firmware: body.firmware };
    const inputs = INPUTS.filter(([bit]) => (body.capabilities & bit) !== 0).map(([, name]) => name);
    const detail =
      `A controller answers at ${factory.description}: firmware ${body.firmware}, line protocol ${body.major}.${body.minor}, on for ${onFor(atUs)}, ` +
      `answer after ${roundTripMs.toFixed(1)} ms. It has: ${inputs.join(', ') || 'no inputs'}. Nothing was moved.`;
    return { ok: true, detail, firmware: body.firmware };
  }
}

function onFor(us: number): string {
  const minutes = Math.floor(us / 60e6);
  if (minutes < 1) return `${Math.floor(us / 1e6)} s`;
  return minutes < 120 ? `${minutes} min` : `${Math.floor(minutes / 60)} h`;
}
