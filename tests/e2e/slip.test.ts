import { demoIds } from '@/db/demo/seed';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand } from './support/hand';
import { labOfThisFile } from './support/lab';
import { issued, read, shortNight, started } from './support/night';

/** The belt slips in the night: the run holds, says by how much, and marks what nothing proves. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
let runId: string;
beforeAll(async () => {
  await lab().server.arm(20);
  runId = await started(lab(), await issued(lab(), shortNight('Slipping night', 4)));
  await lab().pass(2400);
  lab().server.world.controller(demoIds.rig).slip(40);
  await lab().pass(900);
}, 60_000);

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

  chapter('the run is held, and its page says by how much the table slipped', async () => {
    expect(await read(lab(), runId)).toMatchObject({ state: 'held', mayResume: { ok: false } });
    await hand.goes(`/runs/${runId}`, 'run-screen');
    await hand.reads('slip-notice', 'The table slipped by 40 microsteps (0.90°)');
    await hand.reads('resume-why', 'home the rig in a new run');
    await hand.shoots('slip-run');
  });

  chapter('the step log marks the dwell in doubt', async () => {
    await hand.follows(`/runs/${runId}/log`, 'step-log');
    await hand.reads('angle-unproved', 'counted, not proved');
    expect(await hand.at('angle-unproved').count()).toBe(1);
    await hand.shoots('slip-log');
  });

  chapter('the rig keeps the slip until it is homed', async () => {
    await hand.follows(`/rigs/${demoIds.rig}`, 'rig-screen');
    await hand.reads('position-slip', /0\.900°/);
    await hand.shoots('slip-rig');
  });
});
