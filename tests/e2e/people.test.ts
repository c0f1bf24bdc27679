import { sizes, type Size } from '../support/browser';
import { Hand, until } from './support/hand';
import { labOfThisFile, person } from './support/lab';

/** Who comes in by mail: an invitation is sent and taken, a forgotten password is set anew. The mails go over real SMTP. */

jest.setTimeout(120_000);
const lab = labOfThisFile();

/** The one link of the newest mail to an address, once it has come. */
async function linkTo(address: string, subject: RegExp): Promise<string> {
  let link = '';
  await until(async () => {
    const mail = await lab().mailTo(address);
    if (mail === null || !subject.test(mail.subject ?? '')) return false;
    link = /https?:\S+/.exec(mail.text ?? '')?.[0] ?? '';
    return link !== '';
  }, `a mail to ${address}`);
  expect(link).toMatch(new RegExp(`^${lab().address}/`));
  return link;
}

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  beforeEach(async () => {
    hand = new Hand(await lab().open(size));
  });
  afterEach(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  test('an owner invites by mail, and the newcomer joins with a name and a password of their own', async () => {
    const address = `${size}.newcomer@quillfen.example`;
    await lab().enter(hand.browser, 'owner');
    await hand.goes('/lab', 'lab-screen');
    await hand.taps('invite');
    const sheet = hand.page.getByRole('dialog');
    await sheet.getByLabel('E-mail').fill('no address');
    await sheet.getByLabel('Role').selectOption('analyst');
    await hand.tapsOn('Send the invitation');
    await hand.sees(/invalid email/i);
    expect(await sheet.getByLabel('Role').inputValue()).toBe('analyst');
    await sheet.getByLabel('E-mail').fill(address);
    await hand.shoots('invite');
    await hand.tapsOn('Send the invitation');
    await hand.sees(`An invitation is on its way to ${address}.`);
    await hand.sees('analyst, invited');
    await hand.shoots('lab');

    const link = await linkTo(address, /^Invitation to Quillfen Gravity Laboratory$/);
    await hand.context.clearCookies();
    await hand.page.goto(link);
    await hand.sees(`${address} is invited to this lab as analyst.`);
    await hand.page.getByLabel('Your name').fill('Wystan Hallowby');
    await hand.page.getByLabel('Password').fill('short');
    await hand.tapsOn('Join the lab');
    await hand.sees('a password has at least 12 characters');
    await hand.shoots('invitation');
    await hand.page.getByLabel('Password').fill('masses and a thin fibre');
    await hand.tapsOn('Join the lab');
    await hand.at('rigs-screen').waitFor();
    await hand.goes('/lab', 'lab-screen');
    await hand.sees('Wystan Hallowby (you)');

    await hand.page.goto(link);
    await hand.sees('This invitation cannot be used');
  });

  test('a forgotten password is set anew by mail, and all other sessions end', async () => {
    const { email } = person(size === 'phone' ? 'analyst' : 'viewer');
    await hand.goes('/', 'sign-in');
    await hand.tapsOn('Forgotten password', 'link');
    await hand.page.getByLabel('E-mail').fill(email);
    await hand.tapsOn('Send the link');
    await hand.sees(`If ${email} has an account here, a mail with the link is on its way.`);
    await hand.shoots('forgotten-password');

    const link = await linkTo(email, /^Set a new password/);
    const elsewhere = new Hand(await lab().open(size, size === 'phone' ? 'analyst' : 'viewer'));
    await elsewhere.goes('/lab', 'lab-screen');
    await hand.page.goto(link);
    await hand.page.getByLabel('New password').fill('a fibre that was never cut');
    await hand.shoots('reset-password');
    await hand.tapsOn('Set the password');
    await hand.sees('The new password is set. Sign in with it.');
    await elsewhere.page.reload();
    await elsewhere.at('sign-in').waitFor();
    await lab().close(elsewhere.browser);

    await hand.tapsOn('To sign in', 'link');
    await hand.types('sign-in-email', email);
    await hand.types('sign-in-password', 'a fibre that was never cut');
    await hand.taps('sign-in');
    await hand.at('rigs-screen').waitFor();
    await until(
      async () => /^Your Evenfall password was changed$/.test((await lab().mailTo(email))?.subject ?? ''),
      'the mail that tells of the change',
    );

    await hand.page.goto(link);
    await hand.page.getByLabel('New password').fill('a fibre that was cut twice');
    await hand.tapsOn('Set the password');
    await hand.sees(/link.*(used|not valid|unknown|expired|ended)/i);
    await hand.tapsOn('Ask for a new link', 'link');
    await hand.page.getByRole('button', { name: 'Send the link' }).waitFor();
  });
});
