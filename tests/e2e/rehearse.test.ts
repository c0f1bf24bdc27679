import { demoIds } from '@/db/demo/seed';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand, numberOf } from './support/hand';
import { labOfThisFile } from './support/lab';
import { read } from './support/night';

/** Story 2: a protocol is rehearsed on the simulated rig, and the G that comes back lies beside the G that was put in. */

jest.setTimeout(120_000);
const lab = labOfThisFile();

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  const chapter = chapters(() => hand);
  beforeAll(async () => {
    hand = new Hand(await lab().open(size, 'operator'));
  });
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  chapter('the button runs the draft in fast time and leads to the finished night', async () => {
    await hand.goes(`/protocols/${demoIds.shortProtocol}`, 'editor');
    await hand.taps('rehearse');
    await hand.sees(/all 3 h 13 min of it in seconds/);
    await hand.page.getByLabel('Seed').fill('none');
    await hand.sees(/a whole number from 1 to/);
    expect(await hand.isEnabled('rehearse-confirm')).toBe(false);
    await hand.page.getByLabel('Seed').fill(size === 'phone' ? '7' : '8');
    await hand.shoots('rehearse');
    await hand.taps('rehearse-confirm');
    await hand.at('result-screen').waitFor({ timeout: 60_000 });
    expect(await hand.reads('headline', 'Finished')).toMatch(/after 3 h 13 min/);
    await hand.reads('good-dwells', /^12 of 12/);
    await hand.hears('night-strip', /12 of 12 dwells done\. The solid line is the measured deflection/);
  });

  chapter('the recovered G lies within its uncertainty of the true one', async () => {
    if (await hand.at('evaluate').isVisible()) await hand.taps('evaluate');
    const words = await hand.reads('true-g', /u$/);
    const [, trueG, offPercent, sigmas] =
      /true G .*is ([\d. ]+) × 10⁻¹¹ [^;]*; found (?:above|below) it by ([\d. ]+) %, ([\d. ]+) u$/.exec(words) ?? [];
    expect(numberOf(trueG)).toBeCloseTo(6.6743, 4);
    // Two standard uncertainties, and what a night of 12 dwells should reach on this rig.
    expect(numberOf(sigmas)).toBeLessThan(2);
    expect(numberOf(offPercent)).toBeLessThan(1);
    await hand.shoots('rehearsal');
    const runId = new URL(hand.page.url()).pathname.split('/').at(-1) ?? '';
    const view = await read(lab(), runId);
    expect(view).toMatchObject({ rehearsal: true, state: 'finished', simulated: { trueG: 6.6743e-11 } });
  });

  chapter('the rig itself has not moved and is not busy', async () => {
    await hand.follows(`/rigs/${demoIds.rig}`, 'rig-screen');
    await hand.sees('at rest');
    expect(await hand.page.getByTestId('running-now').count()).toBe(0);
    const { items } = await read(lab(), '?active=true&limit=20');
    expect(items).toEqual([]);
  });
});
