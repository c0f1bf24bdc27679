import { randomUUID } from 'node:crypto';
import { demoIds } from '@/db/demo/seed';
import type { Locator } from 'playwright-core';
import { picture, shoot, type Browser } from '../../support/browser';

/** Text as it is compared: the narrow spaces of numbers and units as plain ones. */
export const plain = (text: string) => text.replace(/[\u00a0\u2009\u202f]/g, ' ').trim();

/** A number as it is printed, digits in groups of three, as a number. */
export const numberOf = (text: string | undefined): number => Number((text ?? '').replace(/\s/g, '').replace('−', '-'));

/** The same words with any kind of space between them. */
const loose = (words: string | RegExp) => {
  const source = typeof words === 'string' ? words.replace(/[.*+?^${}()|[\]\\]/g, '\\$&') : words.source;
  return new RegExp(source.replaceAll(' ', '\\s'), typeof words === 'string' ? '' : words.flags);
};

/** A person at a page: taps on a phone, clicks at a desk, reads what is there. */
export class Hand {
  constructor(readonly browser: Browser) {}

  get context() {
    return this.browser.context;
  }

  get page() {
    return this.browser.page;
  }

  at(testId: string): Locator {
    return this.page.getByTestId(testId).first();
  }

  async goes(path: string, arrives: string): Promise<void> {
    await this.page.goto(path);
    await this.at(arrives).waitFor();
  }

  /** From page to page of the program as its own links lead, without loading it anew where it is there already. */
  async follows(path: string, arrives: string): Promise<void> {
    if (!(await this.page.locator('nav').first().isVisible())) return this.goes(path, arrives);
    await this.leads(path);
    await this.at(arrives).waitFor();
  }

  async leads(path: string): Promise<void> {
    await this.page.evaluate((to) => {
      history.pushState({}, '', to);
      window.dispatchEvent(new PopStateEvent('popstate', { state: {} }));
    }, path);
  }

  /** Leaves the program: nothing is drawn while much time passes. */
  async looksAway(): Promise<void> {
    await this.page.goto('about:blank');
  }

  /** A request to the demo lab from the page itself, with its session. */
  async asks(method: 'GET' | 'POST', path: string, { body, etag }: { body?: object; etag?: string } = {}) {
    const headers = {
      'Sec-Fetch-Site': 'same-origin',
      'Idempotency-Key': randomUUID(),
      ...(etag === undefined ? {} : { 'If-Match': etag }),
    };
    const response = await this.context.request.fetch(`/api/labs/${demoIds.lab}${path}`, {
      method,
      headers,
      ...(body === undefined ? {} : { data: body }),
    });
    if (!response.ok()) throw new Error(`${method} ${path}: ${await response.text()}`);
    return { body: await response.json(), etag: response.headers()['etag'] ?? '' };
  }

  async taps(target: string | Locator): Promise<void> {
    const place = typeof target === 'string' ? this.at(target) : target;
    await (this.browser.size === 'phone' ? place.tap() : place.click());
  }

  async tapsOn(name: string | RegExp, role: 'button' | 'link' | 'radio' | 'checkbox' = 'button'): Promise<void> {
    await this.taps(this.page.getByRole(role, { name, exact: typeof name === 'string' }).first());
  }

  /** Presses and keeps, with a finger or with the mouse, until the page says that it is long enough, or lets go too early, after `ms`. */
  async keeps(testId: string, ms?: number): Promise<void> {
    const place = this.at(testId);
    await place.and(this.page.locator(':not([aria-disabled="true"])')).waitFor();
    await place.scrollIntoViewIfNeeded();
    const box = await place.boundingBox();
    if (box === null) throw new Error(`${testId} is not on the page`);
    const point = { x: box.x + box.width / 2, y: box.y + box.height / 2 };
    const enough = () => (ms === undefined ? place.getByText('Now let go').waitFor() : this.page.waitForTimeout(ms));
    if (this.browser.size === 'wide') {
      await this.page.mouse.move(point.x, point.y);
      await this.page.mouse.down();
      await enough();
      await this.page.mouse.up();
      return;
    }
    const finger = await this.browser.context.newCDPSession(this.page);
    await finger.send('Input.dispatchTouchEvent', { type: 'touchStart', touchPoints: [point] });
    await enough();
    await finger.send('Input.dispatchTouchEvent', { type: 'touchEnd', touchPoints: [] });
    await finger.detach();
  }

  /** Chooses an option of a list by its label, or by its value. */
  async chooses(testId: string, option: string): Promise<void> {
    await this.at(testId).selectOption(option);
  }

  async types(testId: string, text: string): Promise<void> {
    await this.at(testId).fill(text);
  }

  /** Waits until the page shows the words. */
  async sees(words: string | RegExp): Promise<void> {
    await this.page.getByText(loose(words)).filter({ visible: true }).first().waitFor();
  }

  /** Waits until an element says something, and returns all that it says. */
  async reads(testId: string, words: RegExp | string = /./): Promise<string> {
    let last = '';
    await until(
      async () => {
        last = plain((await this.at(testId).textContent()) ?? '');
        return typeof words === 'string' ? last.includes(words) : words.test(last);
      },
      () => `${testId} to say ${String(words)}; it says "${last}"`,
    );
    return last;
  }

  /** Waits until an element says something else than before, and returns it. */
  async readsOther(testId: string, before: string): Promise<string> {
    let last = '';
    await until(
      async () => {
        last = plain((await this.at(testId).textContent()) ?? '');
        return last !== '' && last !== before;
      },
      () => `${testId} to say something else than "${before}"`,
    );
    return last;
  }

  /** Waits until a picture in an element says something to those who do not see it, and returns it. */
  async hears(testId: string, words: RegExp): Promise<string> {
    let last = '';
    await until(
      async () => {
        last = plain((await this.at(testId).locator('[role="img"]').first().getAttribute('aria-label')) ?? '');
        return words.test(last);
      },
      () => `${testId} to tell ${String(words)}; it tells "${last}"`,
    );
    return last;
  }

  /** At the page of a rig or of a start: signs the cautions where that is still to be done, and asks to be armed. The key is not turned yet. */
  async asksToArm(opener: 'arm' | 'arm-here' = 'arm'): Promise<void> {
    await this.taps(opener);
    await this.at('arm-sheet').waitFor();
    const sheet = this.page.getByTestId('arm-sheet');
    if ((await sheet.getByTestId('sign-cautions').count()) > 0) await this.taps(sheet.getByTestId('sign-cautions'));
    await sheet.getByTestId('cautions-signed').waitFor();
    await this.taps('arm-on-site');
    await this.taps('arm-confirm');
    await this.at('arming').waitFor();
  }

  /** Turns the virtual key of the demo's rig off and on. How long the way out is shown after that depends on the exit delay: wait for the arm. */
  async turnsVirtualKey(): Promise<void> {
    await this.reads('arming', 'Turn the arm key off first');
    await this.taps('virtual-key');
    await this.reads('arming', 'Turn the arm key on');
    await this.reads('virtual-key', 'on');
    await this.taps('virtual-key');
  }

  async isEnabled(testId: string): Promise<boolean> {
    return this.at(testId).isEnabled();
  }

  /** For the documents, in which a whole page may be shown that is longer than a screen. */
  async pictures(name: string, heightPx?: number): Promise<void> {
    const size = this.page.viewportSize();
    if (heightPx !== undefined && size !== null) await this.page.setViewportSize({ ...size, height: heightPx });
    await picture(this.browser, name);
    if (size !== null) await this.page.setViewportSize(size);
  }

  async shoots(name: string): Promise<void> {
    await shoot(this.browser, name);
  }

  /** In each theme, as if it had been chosen on this device; `there` goes to what is to be seen. */
  async shootsThemes(name: string, there: () => Promise<void>): Promise<void> {
    for (const theme of ['light', 'red', 'dark']) {
      await this.page.evaluate((chosen) => localStorage.setItem('evenfall.theme', chosen), theme);
      await there();
      await this.shoots(`${name}-${theme}`);
    }
  }

  /** Presses Tab until the focus is in the element, as somebody without a mouse does. */
  async tabsTo(testId: string, key = 'Tab'): Promise<void> {
    for (let presses = 0; presses < 120; presses += 1) {
      if (await this.page.evaluate((id) => document.activeElement?.closest(`[data-testid="${id}"]`) != null, testId)) return;
      await this.page.keyboard.press(key);
    }
    throw new Error(`the keyboard does not lead to ${testId}`);
  }
}

/** Waits until a condition holds, looking again often. */
export async function until(holds: () => Promise<boolean> | boolean, what: string | (() => string), withinMs = 30_000): Promise<void> {
  const endMs = performance.now() + withinMs;
  for (;;) {
    if (await holds()) return;
    if (performance.now() > endMs) throw new Error(`waited ${String(withinMs / 1000)} s for ${typeof what === 'string' ? what : what()}`);
    await new Promise((resolve) => setTimeout(resolve, 100));
  }
}

/**
 * Tests that tell one story in order: each needs what the ones before it did. After a failure a picture is kept and the
 * rest say at once that they were not reached.
 */
export function chapters(reader: () => Hand): (name: string, tell: () => Promise<void>) => void {
  let broken: string | null = null;
  return (name, tell) =>
    test(name, async () => {
      if (broken !== null) throw new Error(`not reached: "${broken}" failed`);
      try {
        await tell();
      } catch (error) {
        broken = name;
        await reader()
          .shoots('failed')
          .catch(() => undefined);
        throw error;
      }
    });
}
