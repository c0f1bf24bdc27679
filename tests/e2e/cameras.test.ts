import { demoIds } from '@/db/demo/seed';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { drawRig } from '@/server/ingest/drawn-camera';
import type { StepRowView } from '@/shared/contracts/runs';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';
import { finishedNight, issued, read, shortNight, started } from './support/night';

/** Story 4: what cameras see of a rig, now and at the moments of a run. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
const rig = `/rigs/${demoIds.rig}`;
let finishedId: string;
let runningId: string;
beforeAll(async () => {
  // Cameras are found within half a minute in the lab of a test.
  await lab().pass(31);
  finishedId = await finishedNight(lab(), 1);
  runningId = await started(lab(), await issued(lab(), shortNight('Going on', 12)));
  await lab().pass(60);
}, 120_000);

/** Somebody looks for a while: the lab of a test looks for work twice a minute, and a look counts for 20 s. */
async function looked(): Promise<void> {
  for (let turn = 0; turn < 4; turn += 1) {
    await lab().server.as('viewer', 'GET', `/labs/${demoIds.lab}${rig}/cameras?look=true`).expect(200);
    await lab().pass(10);
  }
}

const decoded = (hand: Hand, testId: string) => until(async () => (await sizeOf(hand, testId)) === '400 x 300', `${testId} to be decoded`);

/** How wide and high the browser found a picture; nothing where it could not be decoded. */
const sizeOf = (hand: Hand, testId: string) =>
  hand.at(testId).evaluate((image) => {
    const { complete, naturalWidth, naturalHeight } = image as HTMLImageElement;
    return complete ? `${String(naturalWidth)} x ${String(naturalHeight)}` : '';
  });

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  const chapter = chapters(() => hand);
  beforeAll(async () => {
    hand = new Hand(await lab().open(size, 'owner'));
  });
  afterAll(async () => {
    // What the server refused is told on the page.
    expect(hand.browser.errors.filter((words) => !/\b(400|422)\b/.test(words))).toEqual([]);
    await lab().close(hand.browser);
  });

  chapter('the page of a rig shows what its camera sees and when that was', async () => {
    await hand.goes(rig, 'cameras');
    await looked();
    await hand.reads('camera-taken', /^Taken \d\d:\d\d:\d\d/);
    await hand.shootsThemes('cameras', async () => {
      await hand.goes(rig, 'camera-picture');
      await decoded(hand, 'camera-picture');
      await hand.at('cameras').scrollIntoViewIfNeeded();
    });
  });

  chapter('a camera at an address that the server may not ask is refused, and it is said who allows it', async () => {
    await hand.taps('add-camera');
    expect(await hand.isEnabled('make-camera')).toBe(false);
    await hand.reads('camera-hosts', 'EVENFALL_CAMERA_HOSTS');
    await hand.types('camera-name', 'Door side');
    await hand.types('camera-address', 'http://camera.lab/picture.jpg');
    await hand.taps('make-camera');
    await hand.sees(/camera\.lab:80 is not among the hosts that cameras may be at/);
    await hand.shoots('camera-sheet');
  });

  chapter('a camera that sends its pictures gets a token once, and its picture is seen', async () => {
    await hand.tapsOn('Sends pictures', 'radio');
    await hand.taps('make-camera');
    const secret = await hand.reads('camera-secret');
    await hand.shoots('camera-token');
    await hand.taps('camera-copied');
    const row = hand.page.getByTestId('camera').filter({ hasText: 'Door side' });
    await row.getByText('No picture was sent yet.').waitFor();
    const answer = await hand.context.request.fetch('/api/camera-pictures', {
      method: 'POST',
      headers: { Authorization: `Bearer ${secret}`, 'Content-Type': 'image/png' },
      data: Buffer.from(drawRig({ rig: demoRigWide, angleDeg: 90, doorClosed: false }, Date.now())),
    });
    expect(answer.status()).toBe(204);
    await row.getByText(/^Taken/).waitFor();
    await row.getByTestId('camera-picture').waitFor();
    await row.getByTestId('remove-camera').click();
    await hand.taps('remove-camera-sure');
    await row.waitFor({ state: 'detached' });
  });

  chapter('a run that goes on shows what its camera sees', async () => {
    await hand.goes(`/runs/${runningId}`, 'run-screen');
    await looked();
    await hand.reads('run-picture-taken', /^Taken \d\d:\d\d:\d\d, \d+ s ago/);
    await hand.shootsThemes('run-camera', async () => {
      await hand.goes(`/runs/${runningId}`, 'run-picture');
      await decoded(hand, 'run-picture');
      await hand.at('run-camera').scrollIntoViewIfNeeded();
    });
  });

  chapter('a swing in the step log holds what was seen when it began and when it ended', async () => {
    const { items } = (await read(lab(), `${finishedId}/steps`)) as { items: StepRowView[] };
    const swing = items.findLast(({ kind }) => kind === 'swing') as StepRowView;
    await hand.shootsThemes('log-frames', async () => {
      await hand.goes(`/runs/${finishedId}/log?row=${String(swing.seq)}`, 'row-frames');
      await decoded(hand, 'frame-picture');
      await hand.at('row-frames').scrollIntoViewIfNeeded();
    });
    const said = await hand.page.getByTestId('frame').allTextContents();
    expect(said).toEqual([expect.stringMatching(/^The swing began, .* Above the rig/), expect.stringMatching(/^The swing ended, /)]);
  });

  chapter('in the replay the frame goes along with the moment', async () => {
    const { items } = (await read(lab(), `${finishedId}/steps`)) as { items: StepRowView[] };
    const swing = items.findLast(({ kind }) => kind === 'swing') as StepRowView;
    const at = new Date(swing.startUtcMs + 1000).toISOString();
    await hand.shootsThemes('replay-camera', async () => {
      await hand.goes(`/runs/${finishedId}/replay?at=${at}`, 'replay-picture');
      await decoded(hand, 'replay-picture');
    });
    await hand.reads('replay-frame', 'The swing began');
    const began = await hand.at('replay-picture').getAttribute('src');
    await hand.taps('replay-next');
    await hand.reads('replay-frame', 'The swing ended');
    expect(await hand.at('replay-picture').getAttribute('src')).not.toBe(began);
    await hand.at('replay-previous').press('Enter');
    await hand.reads('replay-frame', 'The swing began');
    expect(await hand.at('replay-picture').getAttribute('src')).toBe(began);
  });
});
