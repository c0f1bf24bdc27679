import { MailNotSetUp } from '@/server/interfaces/mail';
import { tellByHand, worthAnotherTry, type TellParts, type Told } from '@/server/notify/tell';

const message = { title: 'Held', paragraphs: ['The run is held.'], path: '/runs/1', tag: 'run-1', quiet: false };
const told = (error: Error | null) =>
  tellByHand(
    {
      mail: { send: () => (error === null ? Promise.resolve() : Promise.reject(error)) },
      origin: () => 'https://quillfen.example',
    } as unknown as TellParts,
    { email: 'wren@quillfen.example', devices: [] },
    message,
  );
const outcome = (means: Told['means'], how: Told['outcome']): Told => ({ means, outcome: how, detail: '' });

test('a server without mail says so and is not asked again; a mail server that refuses is', async () => {
  const [, notSetUp] = await told(new MailNotSetUp());
  expect(notSetUp).toMatchObject({ means: 'mail', outcome: 'not-set-up', detail: expect.stringContaining('EVENFALL_SMTP_URL') });
  expect(worthAnotherTry(await told(new MailNotSetUp()))).toBeNull();
  expect(worthAnotherTry(await told(new Error('450 try later')))).toMatchObject({ means: 'mail', detail: '450 try later' });
  expect(worthAnotherTry(await told(null))).toBeNull();
});

test('whoever was reached by one means is not rung again for the sake of the other', () => {
  expect(worthAnotherTry([outcome('push', 'sent'), outcome('mail', 'failed')])).toBeNull();
  expect(worthAnotherTry([outcome('push', 'failed'), outcome('mail', 'sent')])).toBeNull();
  expect(worthAnotherTry([outcome('push', 'failed'), outcome('mail', 'not-set-up')])).toMatchObject({ means: 'push' });
});
