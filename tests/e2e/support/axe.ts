import type { AxeResults, run } from 'axe-core';
import { readFileSync } from 'node:fs';
import type { Hand } from './hand';

const axeSource = readFileSync(require.resolve('axe-core/axe.min.js'), 'utf8');
export const themes = ['dark', 'light', 'red'] as const;

/** Serious and critical findings, each with where. In a theme only colours are new. */
export async function findings(hand: Hand, theme: (typeof themes)[number]): Promise<string[]> {
  await hand.page.evaluate((name) => {
    const page = document.documentElement;
    page.className = page.className.replace(/theme-\w+/g, '');
    page.classList.add(`theme-${name}`);
  }, theme);
  if (!(await hand.page.evaluate(() => 'axe' in window))) await hand.page.evaluate(axeSource);
  // What lies under a sheet cannot be reached, and is looked at on its own.
  const under = (await hand.page.locator('dialog').first().isVisible()) ? 'dialog' : 'html';
  const { violations } = await hand.page.evaluate(
    ([place, rules]): Promise<AxeResults> =>
      (window as unknown as { axe: { run: typeof run } }).axe.run(place, {
        resultTypes: ['violations'],
        preload: false,
        ...(rules === null ? {} : { runOnly: { type: 'rule', values: rules } }),
      }),
    [under, theme === 'dark' ? null : ['color-contrast']] as const,
  );
  return violations
    .filter(({ impact }) => impact === 'serious' || impact === 'critical')
    .flatMap(({ id, nodes }) =>
      nodes.map((node) => `${theme}: ${id} at ${node.target.join(' ')}: ${(node.failureSummary ?? '').split('\n').slice(1, 3).join(' ')}`),
    );
}
