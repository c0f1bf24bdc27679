import { demoIds } from '@/db/demo/seed';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { drawRig } from '@/server/ingest/drawn-camera';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';

/** Story 4: what cameras see of a rig, now and at the moments of a run. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
const rig = `/rigs/${demoIds.rig}`;

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
    // The lab of a test looks for work twice a minute; a look of somebody counts for 20 s.
    for (let turn = 0; turn < 4; turn += 1) {
      await lab().server.as('viewer', 'GET', `/labs/${demoIds.lab}${rig}/cameras?look=true`).expect(200);
      await lab().pass(10);
    }
    await hand.reads('camera-taken', /^Taken \d\d:\d\d:\d\d/);
    await until(async () => (await sizeOf(hand, 'camera-picture')) === '400 x 300', 'the picture to be decoded');
    await hand.at('cameras').scrollIntoViewIfNeeded();
    for (const theme of ['light', 'red', 'dark']) {
      await hand.page.evaluate((name) => localStorage.setItem('evenfall.theme', name), theme);
      await hand.goes(rig, 'camera-picture');
      await until(async () => (await sizeOf(hand, 'camera-picture')) === '400 x 300', 'the picture to be decoded');
      await hand.at('cameras').scrollIntoViewIfNeeded();
      await hand.shoots(`cameras-${theme}`);
    }
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
});
