import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { demoIds } from '@/db/demo/seed';
import { levelsOf, writeSpotFilm } from '../support/spot-film';
import { chapters, Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';

/** Story 6: the lab's laptop reads the light spot with its camera, which here shows a film of a spot whose places are known. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
const page = `/rigs/${demoIds.rig}/light-spot`;
/** The scale of the test: 0.25 mm a px, 10 mm at column 0. */
const mmAt = (px: number) => 10 + px / 4;

let folder: string;
let hand: Hand;
const chapter = chapters(() => hand);

beforeAll(async () => {
  folder = mkdtempSync(join(tmpdir(), 'evenfall-film-'));
  const film = join(folder, 'spot.y4m');
  writeSpotFilm(film);
  hand = new Hand(await lab().open('wide', 'owner', { film }));
}, 60_000);
afterAll(async () => {
  expect(hand.browser.errors).toEqual([]);
  await lab().close(hand.browser);
  rmSync(folder, { recursive: true, force: true });
});

chapter('the page says what is still to do, and opens the camera', async () => {
  const answer = await hand.page.goto(page);
  expect(answer?.headers()['permissions-policy']).toMatch(/^camera=\(self\), microphone=\(\)/);
  await hand.at('spot-screen').waitFor();
  await hand.reads('spot-missing', 'open the camera; mark two places of the scale; choose the channel; give the token of the device');
  expect(await hand.isEnabled('begin-reading')).toBe(false);
  await hand.taps('open-camera');
  await hand.reads('spot-position', 'px');
  expect(await hand.at('region-width').inputValue()).toBe('320');
});

chapter('a region that is not in the picture is refused in words, and one that is is taken', async () => {
  await hand.types('region-height', '900');
  await hand.sees(/The region ends at column 320 and row 980, but the picture has 320 × 240 px/);
  await hand.types('region-top', '90');
  await hand.types('region-height', '60');
  await hand.reads('spot-position', 'px');
});

chapter('marks make the scale, with a residual from the third on', async () => {
  for (const [index, [px, mm]] of [[40, mmAt(40)] as const, [160, mmAt(160) + 0.03] as const, [280, mmAt(280)] as const].entries()) {
    await hand.types('mark-mm', String(mm));
    await hand.taps('mark-spot');
    await hand.page
      .getByTestId('spot-mark')
      .nth(index)
      .getByLabel(/column/)
      .fill(String(px));
  }
  await hand.reads('spot-scale', /off the line by \+0\.020 mm/);
  await hand.reads('scale-fit', /for each px/);
  await hand.page.getByLabel('Take mark 2 away').click();
  await hand.reads('spot-position', 'mm');
});

chapter('a token is made here, and samples flow into the channel', async () => {
  await hand.taps('spot-make-token');
  await hand.taps('begin-reading');
  await hand.at('end-reading').waitFor();
  await hand.shoots('light-spot');
  await hand.taps('go-black');
  await hand.reads('black-figures', /\) mm/);
  await hand.shoots('light-spot-black');
  // The film shows each place for half a second.
  await until(
    async () => new Set((await heard()).map(({ px }) => nearest(px))).size === levelsOf().length,
    'every place of the spot to be stored',
  );
  await hand.taps('black-figures');
  await hand.at('black-screen').waitFor({ state: 'detached' });
  await hand.taps('end-reading');
});

chapter('the channel keeps what the marks leave open', async () => {
  await hand.reads('scale-line', /At column 0 10\.00\(24\) mm; covariance with the slope .* mm²\/px, correlation −0\.80/);
  await hand.taps('keep-scale');
  await hand.reads('scale-kept', 'light spot keeps this u as revision 1 of its calibration.');
  await hand.at('scale-kept').scrollIntoViewIfNeeded();
  await hand.shoots('light-spot-scale');
});

chapter('every sample is where the spot was, to 0.05 px rms', async () => {
  const errors = (await heard()).map(({ px }) => px - nearest(px));
  const rms = Math.sqrt(errors.reduce((sum, error) => sum + error * error, 0) / errors.length);
  process.stdout.write(`     light spot: ${errors.length} samples, error ${rms.toFixed(4)} px rms, ${await hand.reads('spot-rate')}\n`);
  expect(errors.length).toBeGreaterThan(levelsOf().length);
  expect(rms).toBeLessThan(0.05);
});

chapter('the network is cut and the page breaks down: another page sends what waited, in order and once, and goes on reading', async () => {
  await hand.taps('begin-reading');
  await hand.at('end-reading').waitFor();
  await hand.context.setOffline(true);
  const waiting = async () => Number(/^(\d+) samples/.exec(await hand.reads('spot-kept', 'samples'))?.[1]);
  await until(async () => (await waiting()) >= 40, 'samples to wait on the device');
  await hand.reads('spot-trouble', /wait on this device and are sent again; it holds 432 000 of them/);
  await hand.shoots('light-spot-offline');
  const waited = await waiting();
  await hand.page.close();
  const cutAt = lab().server.clock.utcMs() + 500;
  await hand.context.setOffline(false);
  hand.browser.page = await hand.context.newPage();
  await hand.goes(page, 'spot-screen');
  const found = Number(/left (\d+) samples/.exec(await hand.reads('spot-found', 'sent first'))?.[1]);
  expect(found).toBeGreaterThanOrEqual(waited);
  // Nobody pressed anything: the camera is opened and what it shows is read.
  await hand.at('end-reading').waitFor();
  const stored = async () => Number(/^(\d+)/.exec(await hand.reads('spot-stored', 'samples'))?.[1]);
  await until(async () => (await stored()) > found, 'more than was left to be stored');
  const times = (await heard()).map(({ utcMs }) => utcMs).filter((utcMs) => utcMs <= cutAt);
  expect(times).toEqual([...new Set(times)].sort((a, b) => a - b));
  expect(times.filter((utcMs) => utcMs > cutAt - 60_000).length).toBeGreaterThanOrEqual(found);
  await hand.taps('end-reading');
  await hand.reads('spot-waiting', /^0 samples/);
  await hand.reads('spot-kept', /^0 samples/);
});

chapter('a token that is no token keeps the samples on the page and says so', async () => {
  await hand.types('spot-token', 'no token at all');
  await hand.sees('at least 20 characters and no space');
  expect(await hand.isEnabled('begin-reading')).toBe(false);
  await hand.types('spot-token', 'no-token-of-this-lab-at-all');
  await hand.taps('begin-reading');
  await hand.reads('spot-trouble', /There is no such device token, or it was revoked.*wait on this device and are sent again/);
  await hand.taps('end-reading');
});

/** Stored samples as columns of the picture. */
async function heard(): Promise<{ utcMs: number; px: number }[]> {
  const { server } = lab();
  const devices = await server.as('viewer', 'GET', `/labs/${demoIds.lab}/rigs/${demoIds.rig}/devices`).expect(200);
  const found = devices.body.channels.find(({ channel }: { channel: { name: string } }) => channel.name === 'light spot');
  if (found === undefined) return [];
  const nowUtcMs = server.clock.utcMs();
  const samples = await server.services.samples.read(demoIds.lab, found.channel.id, {
    fromUtcMs: nowUtcMs - 600_000,
    toUtcMs: nowUtcMs + 60_000,
  });
  return [...samples.value].map((mm, i) => ({ utcMs: samples.utcMs[i] as number, px: (mm - 10) * 4 }));
}

const nearest = (px: number) => levelsOf().reduce((best, level) => (Math.abs(level - px) < Math.abs(best - px) ? level : best));

chapter('at the rig a channel is calibrated by comparison, by keys alone, and by the figures of a certificate', async () => {
  await hand.goes(`/rigs/${demoIds.rig}`, 'channel-calibrations');
  await hand.reads(
    'channel-calibrations',
    /light spot, revision 1: .* \+ 1\.0000\(\d+\) · reading, correlation.*Scale of the light spot, 2 marks/,
  );
  await hand.tabsTo('add-calibration');
  await hand.page.keyboard.press('Enter');
  await hand.at('calibration-sheet').waitFor();
  await hand.at('calibration-channel').selectOption({ label: 'light spot' });
  const points = [
    ['1: it read', '10'],
    ['the standard said', '10.02'],
    ['2: it read', '60'],
    ['the standard said', '60.12'],
  ] as const;
  for (const [index, [label, text]] of points.entries()) {
    await hand.page
      .getByLabel(label)
      .nth(label.startsWith('the') ? (index - 1) / 2 : 0)
      .focus();
    await hand.page.keyboard.type(text);
  }
  expect(await hand.isEnabled('calibration-save')).toBe(false);
  await hand.types('calibration-u', '0,03');
  await hand.reads('calibration-line', /Value = 0\.000\(36\) mm \+ 1\.002 00\(85\) · reading, correlation −0\.81/);
  await hand.types('calibration-note', 'Against the gauge blocks');
  await hand.shoots('calibration-sheet');
  await hand.at('calibration-save').focus();
  await hand.page.keyboard.press('Enter');
  await hand.reads('channel-calibrations', /light spot, revision 2: 0\.000\(36\) mm \+ 1\.002 00\(85\) · reading/);
  await hand.taps('add-calibration');
  await hand.tapsOn('By its figures', 'radio');
  await hand.types('calibration-uOffset', '0.1');
  await hand.types('calibration-uSlope', '0.01');
  await hand.types('calibration-covariance', '5');
  await hand.types('calibration-note', 'Certificate');
  await hand.taps('calibration-save');
  await hand.sees(/their correlation would be beyond 1/);
  await hand.types('calibration-covariance', '0');
  await hand.page.getByText('Nothing was changed').waitFor({ state: 'detached' });
  await hand.shoots('calibration-figures');
});
