import { sizes, type Size } from '../support/browser';
import { chapters, Hand } from './support/hand';
import { labOfThisFile, type Lab } from './support/lab';
import { finishedNight, issued, read, shortNight, started } from './support/night';

/** Two nights of one rig side by side: one that went as planned, and a longer one that was held within a dwell. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
let first: string;
let second: string;
beforeAll(async () => {
  first = await finishedNight(lab());
  await lab().pass(180);
  second = await heldNight(lab());
  await lab().pass(180);
}, 180_000);

/** Three pairs, the second dwell held for ten minutes and begun anew. */
async function heldNight(place: Lab): Promise<string> {
  const { server } = place;
  await server.arm(20);
  const runId = await started(place, await issued(place, shortNight('Held night', 3)));
  await place.pass(1200);
  await server.intervene(runId, 'hold').expect(202);
  await place.pass(600);
  await server.intervene(runId, 'resume').expect(202);
  await place.pass(3 * 1680 + 1200);
  const { state, reason } = await read(place, runId);
  if (state !== 'finished') throw new Error(`the night is ${state}: ${reason}`);
  return runId;
}

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  const chapter = chapters(() => hand);
  beforeAll(async () => {
    hand = new Hand(await lab().open(size, 'analyst'));
  });
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  chapter('from the step log another run of the rig is chosen', async () => {
    await hand.goes(`/runs/${first}/log`, 'step-log');
    await hand.tapsOn('Compare with another run', 'link');
    await hand.at('compare-screen').waitFor();
    await hand.sees(/Short night/);
    await hand.shoots('compare-choose');
    await hand.chooses('compare-with', second);
    await hand.at('compare-measured').waitFor();
    expect(hand.page.url()).toContain(`with=${second}`);
  });

  chapter('what was measured stands side by side, with how far it differs in units of the u of the difference', async () => {
    await hand.reads('compare-measured', /4 of 4 dwells are good.*6 of 6 dwells are good/);
    await hand.reads('compared-near-far', /mrad.*mrad.*differ by .* u of the difference/);
    await hand.reads('compared-damped-period', /s.*s.*differ by/);
    await hand.reads('differences', /times.*was 2.*is 3/);
  });

  chapter('of the steps those that differ: the dwell that was begun twice, the pair that only one night has', async () => {
    await hand.reads('compared-count', /of \d+ steps differ/);
    await hand.reads('compared-steps', /begun 1 and 2 times/);
    await hand.reads('compared-steps', /only in the second/);
    await hand.shoots('compare');
    await hand.at('compared-steps').scrollIntoViewIfNeeded();
    await hand.shoots('compare-steps');
    await hand.tapsOn('All', 'radio');
    await hand.reads('compared-steps', /Home: finding the edge/);
  });

  chapter('a run that is not there is told, and the other can be chosen anew', async () => {
    await hand.goes(`/runs/${first}/compare?with=00000000-0000-4000-8000-000000000000`, 'compare-screen');
    await hand.at('compare-problem').waitFor();
    await hand.shoots('compare-problem');
    await hand.chooses('compare-with', second);
    await hand.at('compare-measured').waitFor();
  });
});
