import { demoIds } from '@/db/demo/seed';
import { main } from '@/server/boot/evaluate';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { keepsPictures, sizes, type Size } from '../support/browser';
import { chapters, Hand, numberOf, plain, until } from './support/hand';
import { labOfThisFile } from './support/lab';
import { finishedNight } from './support/night';

/** Story 8: a finished night is evaluated, and an outsider recomputes it from the archive. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
/** Pictures of the documents show a night of usual length. */
const pairs = keepsPictures ? 6 : 2;
const nights = new Map<Size, string>();
/** All that is drawn on the page of an evaluation. */
const plots = ['fit-plot', 'side-by-side', 'allan-plot', 'reversal-plot', 'budget-bars', 'g-panel'];

/** `6.674(15) × 10⁻¹¹`, as people read it: the digits in brackets stand at the last places of the value. */
function readUncertain(text: string): { value: number; u: number } {
  const match = /(-?\d[\d .]*)\((\d+)\) ?× ?10([⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+)/.exec(plain(text));
  if (match === null) throw new Error(`no number with its uncertainty in "${text}"`);
  const digits = (match[1] ?? '').replaceAll(' ', '');
  const exponent = Number((match[3] ?? '').replace(/./g, (sign) => (sign === '⁻' ? '-' : String('⁰¹²³⁴⁵⁶⁷⁸⁹'.indexOf(sign)))));
  const decimals = digits.split('.')[1]?.length ?? 0;
  return { value: Number(`${digits}e${String(exponent)}`), u: Number(`${match[2] ?? ''}e${String(exponent - decimals)}`) };
}

/** Lets lab time pass in strides of a second, so that what waits for its turn gets it. */
async function passUntil(holds: () => Promise<boolean>, what: string): Promise<void> {
  await until(async () => {
    await lab().pass(1);
    return holds();
  }, what);
}

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  const chapter = chapters(() => hand);
  beforeAll(async () => {
    nights.set(size, await finishedNight(lab(), pairs));
    hand = new Hand(await lab().open(size, 'analyst'));
  }, 120_000);
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  chapter('G comes out in the notation of the GUM, beside the recommended value', async () => {
    await hand.goes(`/runs/${nights.get(size) ?? ''}`, 'result-screen');
    // Two minutes after the end of the run it is evaluated by itself.
    await lab().pass(180);
    await hand.sees('G so far');
    await hand.tapsOn('Evaluation', 'link');
    await hand.at('evaluation-screen').waitFor();
    const shown = readUncertain(await hand.reads('g-value', '×'));
    // The simulated pendulum of the demo rig obeys the CODATA 2022 value, 6.674 30e-11.
    expect(Math.abs(shown.value - 6.6743e-11)).toBeLessThan(3 * shown.u);
    expect(shown.u / shown.value).toBeLessThan(0.05);
    expect(await hand.reads('g-panel')).toContain('m³ kg⁻¹ s⁻²');
    expect(await hand.reads('en')).toMatch(/^En .*CODATA 2022: agrees/);
    expect(await hand.reads('registered')).toBe('as registered');
    await hand.shoots('evaluation');
    if (size === 'wide') await hand.pictures('evaluation', 1240);
  });

  chapter('every dwell shows its fit and what the fit leaves', async () => {
    expect(await hand.page.getByTestId('dwell-row').count()).toBe(2 * pairs);
    await hand.hears('fit-plot', /^Dwell 4 at far: fit to \d+ bins over 13 min \d+ s, residual rms [\d.]+\([\d.]+\)\sµrad\.$/);
    await hand.tapsOn('Next dwell');
    await hand.hears('fit-plot', /^Dwell 6 at near/);
    expect(await hand.reads('figures')).toMatch(/near − far, \d+ reversal.*damped period.*decay time/);
    await hand.at('fit-panel').scrollIntoViewIfNeeded();
    await hand.shoots('fit');
  });

  chapter('the dwells stand side by side on the same axes, and one leads to its fit, with the keyboard too', async () => {
    const small = hand.page.getByTestId('small-dwell');
    expect(await small.count()).toBeGreaterThan(1);
    await hand.at('side-by-side').scrollIntoViewIfNeeded();
    await hand.shoots('side-by-side');
    await hand.page.getByRole('button', { name: /^Dwell 4 at far/ }).press('Enter');
    await hand.hears('fit-plot', /^Dwell 4 at far/);
  });

  chapter('the residuals are averaged over longer and longer times, by the deviation that is chosen', async () => {
    expect(await hand.reads('allan-words')).toMatch(/\(\d+\) µrad at/);
    await hand.chooses('allan-kind', 'hadamard');
    await hand.sees('A straight drift does not show in it');
    await hand.at('allan-kind').scrollIntoViewIfNeeded();
    await hand.shoots('allan');
  });

  chapter('the budget names each input with its share, and the chain is whole', async () => {
    await hand.taps('budget-table-toggle');
    const rows = hand.page.getByTestId('budget-row');
    expect(await rows.count()).toBeGreaterThan(8);
    const shares = (await rows.locator('td:last-child').allTextContents()).map((text) => numberOf(/^([\d. ]+) %$/.exec(plain(text))?.[1]));
    expect(shares.reduce((sum, share) => sum + share, 0)).toBeGreaterThan(97);
    expect(shares.reduce((sum, share) => sum + share, 0)).toBeLessThan(103);
    expect([...shares].sort((a, b) => b - a)).toEqual(shares);
    await hand.at('budget-table').scrollIntoViewIfNeeded();
    await hand.shoots('budget');
    expect(await hand.reads('chain')).toMatch(/The chain of \d+ events is whole and unchanged/);
  });

  chapter('other methods stand beside, and a value can be tried without changing anything', async () => {
    expect(await hand.reads('method-acceleration')).toMatch(/agrees at k = 2/);
    const before = await hand.reads('g-value', '×');
    await hand.taps('try-a-value');
    await hand.chooses('trial-input', 'sources.mass');
    await hand.types('trial-value', '3.2');
    // Sources of twice the mass: half the G, and the result above stays as it is.
    const tried = readUncertain(await hand.reads('trial', /G would be/));
    expect(tried.value / readUncertain(before).value).toBeCloseTo(0.5, 2);
    expect(await hand.reads('g-value', '×')).toBe(before);
    await hand.taps('trial-reset');
  });

  chapter('the clock of the channel is left as it is, and the page says what that changes; a number that is none is refused', async () => {
    await hand.chooses('clock-way', 'set');
    await hand.page.getByTestId('clock-offset').fill('soon');
    await hand.taps('evaluate');
    await hand.sees('A number of seconds within a day is needed');
    await hand.shoots('clock-refused');
    await hand.chooses('clock-way', 'left');
    await hand.taps('evaluate');
    const effect = hand.page.getByTestId('clock-effect');
    await passUntil(async () => /left as it is, as somebody decided/.test((await effect.allTextContents()).join('')), 'the clock as left');
    await hand.at('clock-effect').scrollIntoViewIfNeeded();
    await hand.shoots('clock-left');
    await hand.chooses('clock-way', 'estimated');
    await hand.taps('evaluate');
    await passUntil(async () => !/as somebody decided/.test((await effect.allTextContents()).join('')), 'the evaluation as usual');
    await hand.at('evaluate').waitFor();
  });

  chapter('the command gives the same G from the downloaded archive', async () => {
    const [download] = await Promise.all([hand.page.waitForEvent('download'), hand.taps('archive')]);
    expect(download.suggestedFilename()).toMatch(/\.zip$/);
    const said: string[] = [];
    const refused: string[] = [];
    const code = await main([await savedAs(download)], { out: (text) => said.push(text), err: (text) => refused.push(text) });
    expect({ code, refused }).toEqual({ code: 0, refused: [] });
    const result = JSON.parse(said.join('')) as EvaluationResult;
    const shown = readUncertain(await hand.reads('g-value', '×'));
    // Shown to two digits of the uncertainty: half a last digit is a quarter of a tenth of u at most.
    expect(Math.abs((result.G?.value ?? NaN) - shown.value)).toBeLessThan(0.06 * shown.u);
    expect(Math.abs((result.G?.u ?? NaN) - shown.u)).toBeLessThan(0.06 * shown.u);
    expect(result.chain.valid).toBe(true);
  });

  chapter('every plot of an evaluation, and the torque of the rig, is drawn in every theme', async () => {
    for (const theme of ['light', 'red', 'dark']) {
      await hand.page.evaluate((chosen) => localStorage.setItem('evenfall.theme', chosen), theme);
      await hand.goes(`/runs/${nights.get(size) ?? ''}/evaluation`, 'evaluation-screen');
      for (const plot of plots) {
        await hand.at(plot).scrollIntoViewIfNeeded();
        await hand.shoots(`${plot}-${theme}`);
      }
      await hand.goes(`/rigs/${demoIds.rig}/stations`, 'torque-plot');
      await hand.at('torque-plot').scrollIntoViewIfNeeded();
      await hand.shoots(`torque-plot-${theme}`);
    }
  });
});

/** The command tells an archive by its name. */
async function savedAs(download: { path(): Promise<string>; saveAs(path: string): Promise<void> }): Promise<string> {
  const path = `${await download.path()}.zip`;
  await download.saveAs(path);
  return path;
}
