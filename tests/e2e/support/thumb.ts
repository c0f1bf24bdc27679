import type { Locator } from 'playwright-core';
import type { Hand } from './hand';

/** A thumb on a plot: a finger on a phone, the mouse at a desk. Places are shares of the plot's width. */
export class Thumb {
  constructor(private readonly hand: Hand) {}

  async taps(plot: Locator, share: number): Promise<void> {
    const { x, y } = await this.point(plot, share);
    if (this.hand.browser.size === 'phone') await this.hand.page.touchscreen.tap(x, y);
    else await this.hand.page.mouse.click(x, y);
  }

  async strokes(plot: Locator, from: number, to: number, count = 5): Promise<void> {
    const ends = [await this.point(plot, from), await this.point(plot, to)] as const;
    const steps = Array.from({ length: count }, (_, k) => ({ x: ends[0].x + ((k + 1) / count) * (ends[1].x - ends[0].x), y: ends[0].y }));
    const { page } = this.hand;
    if (this.hand.browser.size === 'wide') {
      await page.mouse.move(ends[0].x, ends[0].y);
      await page.mouse.down();
      for (const { x, y } of steps) await page.mouse.move(x, y);
      await page.mouse.up();
      return;
    }
    const finger = await this.hand.context.newCDPSession(page);
    const touch = (type: 'touchStart' | 'touchMove' | 'touchEnd', touchPoints: { x: number; y: number }[]) =>
      finger.send('Input.dispatchTouchEvent', { type, touchPoints });
    await touch('touchStart', [ends[0]]);
    for (const step of steps) await touch('touchMove', [step]);
    await touch('touchEnd', []);
    await finger.detach();
  }

  private async point(plot: Locator, share: number): Promise<{ x: number; y: number }> {
    await plot.scrollIntoViewIfNeeded();
    const box = await plot.boundingBox();
    if (box === null) throw new Error('the plot is not on the page');
    return { x: box.x + share * box.width, y: box.y + box.height / 2 };
  }
}
