import { createConnection, createServer, type AddressInfo } from 'node:net';
import { mkdtempSync, readdirSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { simpleParser } from 'mailparser';
import { startDemoMailbox, type DemoMailbox } from '@/server/notify/demo-mailbox';
import { invitationMail, passwordChangedMail, passwordResetMail } from '@/server/notify/mails';
import { createSmtpMail } from '@/server/notify/smtp-mail';

const clock = { utcMs: () => Date.parse('2031-05-06T20:00:00.123Z') };
const from = 'Evenfall <evenfall@quillfen.example>';
const letter = {
  to: 'ilse@quillfen.example',
  subject: 'Grüße – near − far',
  text: 'First line.\n\n.A line that begins with a dot.\nG = 6.674(15) × 10⁻¹¹\n',
};

let folder: string;
let mailbox: DemoMailbox;
beforeEach(async () => {
  folder = mkdtempSync(join(tmpdir(), 'evenfall-mail-'));
  mailbox = await startDemoMailbox({ folder, clock });
});
afterEach(async () => {
  await mailbox.close();
  rmSync(folder, { recursive: true });
});

test('a mail arrives over SMTP as a file, word for word', async () => {
  const mail = createSmtpMail({ url: mailbox.url, from });
  await mail.send(letter);
  mail.close();
  const [name] = readdirSync(folder);
  expect(name).toBe('2031-05-06T20-00-00 001 ilse@quillfen.example.eml');
  const parsed = await simpleParser(readFileSync(join(folder, name ?? '')));
  expect(parsed).toMatchObject({ subject: letter.subject, text: letter.text });
  expect(parsed.from?.text).toBe('"Evenfall" <evenfall@quillfen.example>');
  expect(parsed.headers.get('auto-submitted')).toBe('auto-generated');
});

test('an address cannot lead the file out of its folder', async () => {
  const mail = createSmtpMail({ url: mailbox.url, from });
  await mail.send({ ...letter, to: 'a/etc/b@quillfen.example' });
  mail.close();
  expect(readdirSync(folder)).toEqual([expect.stringMatching(/^2031-05-06T20-00-00 001 a_etc_b@quillfen\.example\.eml$/)]);
});

test('a subject cannot smuggle in another header', async () => {
  const mail = createSmtpMail({ url: mailbox.url, from });
  await mail.send({ ...letter, subject: 'Hello\r\nBcc: other@quillfen.example' });
  mail.close();
  const parsed = await simpleParser(readFileSync(join(folder, readdirSync(folder)[0] ?? '')));
  expect(parsed.bcc).toBeUndefined();
});

test('a mail that is too large is refused and not kept', async () => {
  const mail = createSmtpMail({ url: mailbox.url, from });
  await expect(mail.send({ ...letter, text: 'x'.repeat(1_200_000) })).rejects.toThrow(/size|large|1048576/i);
  mail.close();
  expect(readdirSync(folder)).toEqual([]);
});

test('the mailbox listens on loopback only and outlives a client that hangs up', async () => {
  const { hostname, port } = new URL(mailbox.url);
  expect(hostname).toBe('127.0.0.1');
  const socket = createConnection(Number(port), hostname);
  await new Promise((resolve) => socket.once('data', resolve));
  socket.write('MAIL FR');
  socket.destroy();
  const mail = createSmtpMail({ url: mailbox.url, from });
  await mail.send(letter);
  mail.close();
  expect(readdirSync(folder)).toHaveLength(1);
});

test('a mail server that refuses rejects with its own words', async () => {
  const server = createServer((socket) => {
    socket.on('error', () => undefined);
    socket.end('554 5.7.1 no mail from you\r\n');
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  const mail = createSmtpMail({ url: `smtp://127.0.0.1:${String((server.address() as AddressInfo).port)}`, from });
  await expect(mail.send(letter)).rejects.toThrow('no mail from you');
  mail.close();
  server.close();
});

describe('the words of the mails', () => {
  const person = { to: 'a@quillfen.example', name: 'Ilse Marrow' };
  const invitation = {
    to: person.to,
    labName: 'Quillfen Gravity Laboratory',
    timeZone: 'Europe/Zurich',
    invitedBy: 'Ottilie Brand',
    link: 'https://balance.example/invitations/t',
    expiresAtUtcMs: clock.utcMs(),
  };

  test.each([
    ['invitation', invitationMail({ ...invitation, role: 'viewer' }), invitation.link],
    [
      'reset',
      passwordResetMail({ ...person, link: 'https://balance.example/reset-password?token=t', validMinutes: 30 }),
      'https://balance.example/reset-password?token=t',
    ],
  ])('of the %s hold the one link on a line of its own', (_name, mail, link) => {
    expect(mail.text.split('\n').filter((line) => line.includes('http'))).toEqual([link]);
  });

  test('name the role and what it may, and that anybody may stop', () => {
    const { text } = invitationMail({ ...invitation, role: 'analyst' });
    expect(text).toContain('as analyst.');
    expect(text).toContain('import data and evaluate runs');
    expect(text).toContain('you may hold or stop a run at any time');
    expect(text).toContain('2031-05-06 22:00, Europe/Zurich');
  });

  test('of a change need no link', () => {
    expect(passwordChangedMail({ ...person, at: '2031-05-06 20:00 UTC' }).text).not.toContain('http');
  });

  test('take a name with line breaks as one line', () => {
    const mail = invitationMail({ ...invitation, labName: 'Quillfen\r\nBcc: x', role: 'viewer' });
    expect(mail.subject).toBe('Invitation to Quillfen Bcc: x');
  });
});
