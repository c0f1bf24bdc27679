import { MailNotSetUp, type MailPort } from '../interfaces/mail';
import type { PushMessage, PushPort } from '../interfaces/push';
import type { Database } from '../store/database';
import { notePushed, pushDevicesOf, removePushDevice, type PushDeviceRecord } from '../store/push-devices';

export interface TellParts {
  db: Database;
  clock: { utcMs(): number };
  mail: MailPort;
  push: PushPort;
  /** Address of the server as people reach it, without a slash at its end. */
  origin(): string;
}

export interface Message {
  /** Short enough for the first line of a telephone. */
  title: string;
  /** Paragraphs of the mail; a push message shows the first. */
  paragraphs: readonly string[];
  /** Path within the application that shows more. */
  path: string;
  tag: string;
  quiet: boolean;
}

export interface Told {
  means: 'push' | 'mail';
  outcome: 'sent' | 'failed' | 'not-set-up';
  detail: string;
}

/** What failed, where it is worth another try: whoever was reached by one means is not rung again for the sake of the other. */
export const worthAnotherTry = (told: readonly Told[]): Told | null =>
  told.some(({ outcome }) => outcome === 'sent') ? null : (told.find(({ outcome }) => outcome === 'failed') ?? null);

export const oneLine = (text: string) => text.replace(/\s+/g, ' ').trim();
const wordsOf = (error: unknown) => oneLine(error instanceof Error ? error.message : String(error)).slice(0, 500);

/** Tells a person by every means there is: push is best effort and never alone. Says what became of each; never rejects for a message that did not go. */
export async function tellPerson(parts: TellParts, person: { userId: string; email: string }, message: Message): Promise<Told[]> {
  const devices = await pushDevicesOf(parts.db, person.userId);
  return tellByHand(parts, { email: person.email, devices }, message);
}

/** The same where the devices are known: no database is needed. */
export async function tellByHand(
  parts: TellParts,
  { email, devices }: { email: string; devices: readonly PushDeviceRecord[] },
  message: Message,
): Promise<Told[]> {
  const [pushed, mailed] = await Promise.all([pushTo(parts, devices, message), mailTo(parts, email, message)]);
  return [...pushed, mailed];
}

async function pushTo({ db, push, clock }: TellParts, devices: readonly PushDeviceRecord[], message: Message): Promise<Told[]> {
  if (devices.length === 0) return [{ means: 'push', outcome: 'not-set-up', detail: 'no browser takes push messages for this person' }];
  const { title, path, tag, quiet } = message;
  const short: PushMessage = { title, body: (message.paragraphs[0] ?? '').slice(0, 300), path, tag, quiet };
  return Promise.all(
    devices.map(async (device): Promise<Told> => {
      try {
        const outcome = await push.send(device, short);
        // What is noted about a browser must not undo what was sent.
        const noting = outcome === 'gone' ? removePushDevice(db, device) : notePushed(db, device, clock.utcMs());
        noting.catch(() => undefined);
        return outcome === 'gone'
          ? { means: 'push', outcome: 'failed', detail: `${device.device}: takes no messages any more, forgotten` }
          : { means: 'push', outcome: 'sent', detail: device.device };
      } catch (error) {
        return { means: 'push', outcome: 'failed', detail: `${device.device}: ${wordsOf(error)}` };
      }
    }),
  );
}

async function mailTo({ mail, origin }: TellParts, to: string, { title, paragraphs, path }: Message): Promise<Told> {
  try {
    await mail.send({ to, subject: oneLine(title), text: `${[...paragraphs, `${origin()}${path}`].join('\n\n')}\n` });
    return { means: 'mail', outcome: 'sent', detail: '' };
  } catch (error) {
    return { means: 'mail', outcome: error instanceof MailNotSetUp ? 'not-set-up' : 'failed', detail: wordsOf(error) };
  }
}
