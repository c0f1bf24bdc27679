import { themeNames } from '@/components/theme/tokens';
import { demoPassword } from '@/db/demo/seed';
import { sizes, type Size } from '../support/browser';
import { Hand } from './support/hand';
import { labOfThisFile, person } from './support/lab';

/** The sign-in page stands before its program has come: as it will look, and usable. */

jest.setTimeout(60_000);
const lab = labOfThisFile();

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  beforeEach(async () => {
    hand = new Hand(await lab().open(size));
  });
  afterEach(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  /** Lets the program come when what it returns is called. */
  const holdTheProgram = async () => {
    let release: () => void = () => undefined;
    const released = new Promise<void>((resolve) => {
      release = resolve;
    });
    const entry = /\/entry-\w+\.js$/;
    await hand.page.unroute(entry);
    await hand.page.route(entry, async (route) => {
      await released;
      await route.continue();
    });
    return release;
  };
  const programHasCome = () => hand.page.locator('#root:not([data-early])').waitFor();
  const look = async () => {
    await hand.page.evaluate('document.fonts.ready');
    return (await hand.page.screenshot({ caret: 'hide' })).toString('base64');
  };

  test('in no theme anything changes when the program comes', async () => {
    // The words that only a demo adds come with an answer of the server.
    await hand.page.route('**/api/health', () => undefined);
    await hand.page.goto('/icon.svg');
    for (const theme of size === 'phone' ? themeNames : (['dark'] as const)) {
      await hand.page.evaluate((name) => localStorage.setItem('evenfall.theme', name), theme);
      const release = await holdTheProgram();
      await hand.page.goto('/', { waitUntil: 'commit' });
      await hand.at('sign-in').waitFor();
      const before = await look();
      release();
      await programHasCome();
      expect((await look()) === before).toBe(true);
    }
  });

  test('what is typed and pressed before the program has come is not lost, and typing goes on in the same field', async () => {
    const { email } = person('operator');
    const release = await holdTheProgram();
    await hand.page.goto('/sign-in', { waitUntil: 'commit' });
    await hand.types('sign-in-email', email);
    await hand.types('sign-in-password', 'swing at noon');
    await hand.page.keyboard.press('Enter');
    release();
    await hand.page.getByRole('alert').first().waitFor();
    expect(await hand.at('sign-in-email').inputValue()).toBe(email);
    expect(new URL(hand.page.url()).search).toBe('');

    const releaseAgain = await holdTheProgram();
    await hand.page.reload({ waitUntil: 'commit' });
    await hand.types('sign-in-email', email);
    await hand.at('sign-in-password').focus();
    await hand.page.keyboard.type(demoPassword.slice(0, 7));
    releaseAgain();
    await programHasCome();
    await hand.page.keyboard.type(demoPassword.slice(7));
    await hand.taps('sign-in');
    await hand.at('rigs-screen').waitFor();
  });
});
