import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { demoIds } from '@/db/demo/seed';
import { writeSpotFilm } from '../support/spot-film';
import { chapters, Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';

/** A device's own camera looks at the rig; here it shows a film. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
const rig = `/rigs/${demoIds.rig}`;

describe.each(['phone', 'wide'] as const)('%s', (size) => {
  let folder: string;
  let hand: Hand;
  const chapter = chapters(() => hand);
  beforeAll(async () => {
    folder = mkdtempSync(join(tmpdir(), 'evenfall-film-'));
    const film = join(folder, 'spot.y4m');
    writeSpotFilm(film);
    hand = new Hand(await lab().open(size, 'owner', { film }));
  }, 60_000);
  afterAll(async () => {
    // A token that counts no more is told on the page.
    expect(hand.browser.errors.filter((words) => !/\b401\b/.test(words))).toEqual([]);
    await lab().close(hand.browser);
    rmSync(folder, { recursive: true, force: true });
  });

  chapter('the page says what is still to do, opens the camera and adds it to the rig', async () => {
    await hand.goes(rig, 'to-send-pictures');
    await hand.taps('to-send-pictures');
    await hand.reads('send-missing', 'Still to do: open the camera; add it to the rig, or give its token.');
    await hand.taps('open-camera');
    await hand.reads('send-missing', 'Still to do: add it to the rig, or give its token.');
    await hand.types('send-name', `Film ${size}`);
    await hand.taps('send-make');
    await until(async () => hand.isEnabled('send-begin'), 'the pictures to be sendable');
  });

  chapter('its pictures are sent, and seen on the page of the rig', async () => {
    await hand.taps('send-begin');
    await hand.reads('send-state', /^[1-9]\d* sent, the last/);
    await hand.shoots('send-pictures');
    const other = new Hand(await lab().open('wide', 'viewer'));
    await other.goes(rig, 'cameras');
    const row = other.page.getByTestId('camera').filter({ hasText: `Film ${size}` });
    await row.getByText(/^Taken/).waitFor();
    const image = row.getByTestId('camera-picture');
    await until(async () => image.evaluate((one) => (one as HTMLImageElement).naturalWidth > 100), 'the picture to be decoded');
    expect(other.browser.errors).toEqual([]);
    await lab().close(other.browser);
  });

  chapter('it says what may end it, and a page that was loaded anew goes on by itself', async () => {
    await hand.reads('spot-warnings', /The device may fall asleep|This browser cannot keep the device awake|On battery/);
    await hand.goes(`${rig}/send-pictures`, 'send-pictures-screen');
    await hand.reads('send-state', /^[1-9]\d* sent, the last/);
    await hand.at('send-end').waitFor();
  });

  chapter('when the camera is removed from the rig the page stops, and says why', async () => {
    const { body } = await lab().server.as('owner', 'GET', `/labs/${demoIds.lab}${rig}/cameras`).expect(200);
    const { id } = (body as { items: { id: string; name: string }[] }).items.find(({ name }) => name === `Film ${size}`) as { id: string };
    await lab().server.as('owner', 'DELETE', `/labs/${demoIds.lab}${rig}/cameras/${id}`).expect(204);
    await hand.reads('send-trouble', /No camera has this token, or it was removed/);
    await hand.at('send-begin').waitFor();
  });
});
