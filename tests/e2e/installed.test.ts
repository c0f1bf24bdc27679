import { sizes, type Size } from '../support/browser';
import { Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';
import { Network } from './support/network';

/** The program kept on the device: what is there without a network, and what never is. */

jest.setTimeout(60_000);
const lab = labOfThisFile();

test.each(Object.keys(sizes) as Size[])(
  '%s: a page opened without a network says what goes on, and comes back by itself; the device keeps nothing that the server said',
  async (size) => {
    const network = await Network.to(lab().address);
    const hand = new Hand(await lab().open(size, 'operator', { address: network.address, installs: true }));
    const { page } = hand;
    await hand.goes('/runs', 'runs-screen');
    expect(await page.evaluate(async () => (await navigator.serviceWorker.ready).active !== null)).toBe(true);
    await hand.goes('/rigs', 'rigs-screen');
    expect(await page.evaluate(() => navigator.serviceWorker.controller !== null)).toBe(true);

    network.become('cut');
    await page.goto('/runs');
    await hand.sees('A run goes on by itself');
    await hand.sees('Use the switch at the rig');
    for (const theme of size === 'phone' ? ['dark', 'light', 'red'] : ['dark']) {
      await page.evaluate((name) => document.documentElement.setAttribute('class', `theme-${name}`), theme);
      await page.evaluate('document.fonts.ready');
      await hand.shoots(`offline-${theme}`);
    }
    await hand.tapsOn('Try now');
    await hand.sees('Still no answer.');
    expect(new URL(page.url()).pathname).toBe('/runs');
    network.become('open');
    await hand.at('runs-screen').waitFor();

    const kept = await page.evaluate(async () => {
      const names = await caches.keys();
      const requests = await Promise.all(names.map(async (name) => (await caches.open(name)).keys()));
      return requests.flat().map(({ url }) => new URL(url).pathname);
    });
    expect(kept).toContain('/offline.html');
    expect(kept.filter((path) => !/^\/(_expo\/static|assets|fonts)\//.test(path))).toEqual(['/offline.html']);
    await until(() => hand.browser.errors.length === 0, 'no error on the page');
    await lab().close(hand.browser);
    await network.close();
  },
);
