import { demoIds } from '@/db/demo/seed';
import { reportCondition } from '@/server/store/alarms';
import type { ChannelView } from '@/shared/contracts/data';
import type { ExclusionView } from '@/shared/contracts/exclusions';
import type { RunView } from '@/shared/contracts/runs';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';
import { finishedNight, read } from './support/night';
import { Thumb } from './support/thumb';

/** Stories 6 and 7: a night is looked at closely; the room stands under the deflection, and what spoils the data is marked where it is seen. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
const base = `/labs/${demoIds.lab}`;
/** A channel that is read so often that half of the run has a hundred thousand samples. */
let fine: string;
const fineSamples = 220_000;
let runId: string;
/** Begin and end of the run, UTC ms. */
let night: { from: number; to: number };

beforeAll(async () => {
  runId = await finishedNight(lab(), 1);
  const { startedAt, endedAt } = (await read(lab(), runId)) as RunView;
  night = { from: Date.parse(startedAt ?? ''), to: Date.parse(endedAt ?? '') };
  const room = [
    { name: 'box temperature', role: 'environment', unit: '°C', rateHz: 0.1 },
    { name: 'air pressure', role: 'environment', unit: 'hPa', rateHz: 0.1 },
  ];
  const made = await lab()
    .server.as('owner', 'POST', `${base}/rigs/${demoIds.rig}/devices`)
    .send({ name: 'room', channels: room })
    .expect(201);
  const lines: string[] = [];
  for (let utcMs = night.from; utcMs < night.to; utcMs += 10_000) {
    const time_utc = new Date(utcMs).toISOString();
    const k = (utcMs - night.from) / 10_000;
    lines.push(JSON.stringify({ channel: 'box temperature', time_utc, value: 19.2 + 0.3 * Math.sin(k / 20) + 0.004 * ((k * 7) % 5) }));
    lines.push(JSON.stringify({ channel: 'air pressure', time_utc, value: 1013.2 - 0.004 * k + 0.01 * ((k * 3) % 4) }));
  }
  const sent = await fetch(`${lab().address}/api/samples`, {
    method: 'POST',
    headers: { authorization: `Bearer ${String(made.body.secret)}`, 'content-type': 'application/x-ndjson' },
    body: lines.join('\n'),
  });
  expect(await sent.json()).toMatchObject({ stored: lines.length });
  const known = await lab().server.as('viewer', 'GET', `${base}/rigs/${demoIds.rig}/channels`).expect(200);
  const air = (known.body.items as ChannelView[]).find(({ name }) => name === 'air pressure')?.id;
  const calibration = { offset: 0, slope: 1, uOffset: 0.5, uSlope: 0, covariance: 0 };
  await lab()
    .server.as('keeper', 'POST', `${base}/rigs/${demoIds.rig}/calibrations`)
    .send({ channelId: air, validFrom: '2020-01-01T00:00:00Z', calibration, note: 'Certificate of the barometer' })
    .expect(201);
  const { database, samples } = lab().server.services;
  const tracker = { name: 'tracker', channels: [{ name: 'fast spot', role: 'deflection', unit: 'rad', rateHz: 130 }] };
  await lab().server.as('owner', 'POST', `${base}/rigs/${demoIds.rig}/devices`).send(tracker).expect(201);
  const { channels } = (await read(lab(), `${runId}/samples?points=10`)) as { channels: ChannelView[] };
  fine = channels.find(({ name }) => name === 'fast spot')?.id ?? '';
  const utcMs = Float64Array.from({ length: fineSamples }, (_, k) => night.from + (k * (night.to - night.from)) / fineSamples);
  const value = utcMs.map((at, k) => 2e-3 * Math.sin((2 * Math.PI * (at - night.from)) / 420_000) + 1e-5 * ((k * 7919) % 13));
  await samples.append(demoIds.lab, fine, { utcMs, value });
  const place = { labId: demoIds.lab, rigId: demoIds.rig, code: 'clock-stepped' as const, subject: 'host' };
  const found = { met: true, words: 'The clock of the server jumped by 1200 ms.', runId, utcMs: night.from + 840_000 };
  await database.db.transaction((tx) => reportCondition(tx, place, found));
}, 120_000);

/** Times between the frames that the page draws meanwhile, ms. */
async function framesWhile(hand: Hand, act: () => Promise<void>): Promise<number[]> {
  await hand.page.evaluate(() => {
    const kept: number[] = [];
    Object.assign(window, { kept });
    const draw = (now: number) => {
      kept.push(now);
      requestAnimationFrame(draw);
    };
    requestAnimationFrame(draw);
  });
  await act();
  const stamps = await hand.page.evaluate(() => (window as unknown as { kept: number[] }).kept);
  return stamps.slice(1).map((at, k) => at - (stamps[k] ?? at));
}

const exclusionsOf = async () => ((await read(lab(), `${runId}/exclusions`)) as { items: ExclusionView[] }).items;
const inForce = async () => (await exclusionsOf()).filter(({ withdrawn }) => withdrawn === null);

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  const chapter = chapters(() => hand);
  const canvasOf = (name: string) => hand.page.locator(`[data-testid="${name}"] .u-over`).first();
  /** How far the cursor of a plot stands from its left edge, as a share of its width; null while there is none. */
  const cursorIn = (name: string) =>
    canvasOf(name).evaluate((over) => {
      const [, px = '-10'] = /translate\((-?[\d.]+)px/.exec((over.querySelector('.u-cursor-x') as HTMLElement).style.transform) ?? [];
      return Number(px) < 0 ? null : Number(px) / over.clientWidth;
    });
  beforeAll(async () => {
    hand = new Hand(await lab().open(size, 'analyst'));
  });
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  chapter('the room stands under the deflection, each channel with its unit, and one cursor reads all of them', async () => {
    await hand.goes(`/runs/${runId}/data`, 'channel-plot');
    await canvasOf('deflection-plot').waitFor();
    await canvasOf('pane-air pressure').waitFor();
    if (size === 'phone') {
      expect(await hand.at('pane-box temperature').locator('canvas').count()).toBe(0);
      await hand.taps('pane-toggle-box temperature');
    }
    await canvasOf('pane-box temperature').waitFor();
    await new Thumb(hand).taps(canvasOf('deflection-plot'), 0.4);
    await hand.reads('plot-time', /^\d\d:\d\d:\d\d/);
    await hand.reads('plot-reading', /rad/);
    // Readings with the scatter of single ones in brackets, and the unit.
    await hand.reads('pane-reading-box temperature', /^19\.\d+\(\d+\) °C$/);
    // Its calibration leaves 0.5 hPa open: that decides, in the table for those who do not see the plot too.
    await hand.reads('pane-reading-air pressure', /^101\d\.\d\d\(50\) hPa$/);
    expect(await hand.at('pane-air pressure').locator('table').textContent()).toMatch(/101\d\.\d\d\(50\)\shPa/);
    await hand.taps('pane-toggle-turntable');
    await hand.reads('pane-reading-turntable', /^[−\d.]+\(\d+\)°$/);
    const shares = await Promise.all(['deflection-plot', 'pane-box temperature', 'pane-air pressure', 'pane-turntable'].map(cursorIn));
    for (const share of shares) expect(share).toBeCloseTo(0.4, 1);
    expect(Math.max(...shares.map(Number)) - Math.min(...shares.map(Number))).toBeLessThan(0.005);
    await hand.shoots('plots');
  });

  chapter('they are zoomed and moved together, by buttons too, and the address leads back to it', async () => {
    const begin = () => new URL(hand.page.url()).searchParams.get('from');
    const writes = async (act: () => Promise<void>) => {
      const before = begin();
      await act();
      await until(() => begin() !== before, 'the address to hold the stretch');
    };
    await writes(() => hand.tapsOn('Show a shorter time'));
    await writes(() => hand.tapsOn('Show a shorter time'));
    await writes(() => hand.taps('plot-later'));
    const asked = new URL(hand.page.url());
    const stretch = ['from', 'to'].map((end) => Date.parse(asked.searchParams.get(end) ?? ''));
    expect((Number(stretch[1]) - Number(stretch[0])) / (night.to - night.from)).toBeCloseTo(0.25, 1);
    const rows = () => hand.at('pane-box temperature').locator('caption + thead + tbody tr').first().textContent();
    const [first, deflection] = [await rows(), await hand.at('deflection-plot').locator('tbody tr').first().textContent()];
    // Both tables begin with the same clock time: the left edge.
    expect(first?.slice(0, 8)).toBe(deflection?.slice(0, 8));
    await hand.goes(asked.pathname + asked.search, 'channel-plot');
    await canvasOf('pane-turntable').waitFor();
    expect((await rows())?.slice(0, 8)).toBe(first?.slice(0, 8));
    const again = new URL(hand.page.url());
    expect(again.searchParams.get('from')).toBe(asked.searchParams.get('from'));
    await hand.tapsOn('Show all');
    await until(() => !hand.page.url().includes('from='), 'the address to say nothing of the whole run');
  });

  chapter('a moment in the address is what the cursor stands on', async () => {
    const at = new Date(night.from + 600_000).toISOString();
    await hand.goes(`/runs/${runId}/data?at=${at}`, 'channel-plot');
    await canvasOf('deflection-plot').waitFor();
    expect(await cursorIn('deflection-plot')).toBeCloseTo(0.5, 1);
    await hand.tapsOn('Show all');
  });

  chapter('a stretch is marked by a stroke over the plot and excluded with a reason', async () => {
    await hand.taps('mark');
    await hand.reads('marking', /Drag over the plot/);
    await new Thumb(hand).strokes(canvasOf('deflection-plot'), 0.5, 0.6);
    await hand.reads('marking', /Marked: \d\d:\d\d:\d\d to \d\d:\d\d:\d\d, /);
    await hand.shoots('marked');
    await hand.taps('mark-exclude');
    await hand.types('exclude-reason', `a lorry, ${size}`);
    await hand.shoots('exclude-marked');
    await hand.taps('exclude-send');
    await hand.hears('channel-plot', new RegExp(`1 excluded, hatched: \\d\\d:\\d\\d:\\d\\d to .* \\(a lorry, ${size}\\)`));
    const [made] = await inForce();
    const shares = [made?.startUtcMs, made?.endUtcMs].map((at) => (Number(at) - night.from) / (night.to - night.from));
    expect(shares[0]).toBeCloseTo(0.5, 1);
    expect(shares[1]).toBeCloseTo(0.6, 1);
  });

  chapter('what is hatched is tapped to see who excluded it and why, and is withdrawn there', async () => {
    await new Thumb(hand).taps(canvasOf('deflection-plot'), 0.55);
    await hand.reads('tapped-exclusion', new RegExp(`Excluded .*a lorry, ${size}.*by Tam Ferrowdale`));
    await hand.shoots('tapped-exclusion');
    await hand.taps(hand.page.getByTestId('tapped-exclusion').getByTestId('withdraw'));
    await hand.types('withdraw-reason', `it was next door, ${size}`);
    await hand.taps('withdraw-send');
    await hand.reads('tapped-exclusion', new RegExp(`Withdrawn .*it was next door, ${size}`));
    await hand.taps('sheet-close');
    expect(await inForce()).toEqual([]);
  });

  chapter('without any drag: two taps, or the cursor and a button', async () => {
    await hand.taps('mark');
    const thumb = new Thumb(hand);
    await thumb.taps(canvasOf('deflection-plot'), 0.3);
    await hand.reads('marking', /now tap where it ends/);
    await thumb.taps(canvasOf('pane-air pressure'), 0.2);
    await hand.reads('marking', /Marked: /);
    await hand.taps('mark-end');
    await hand.reads('marking', /now tap where it ends/);
    await hand.taps('mark-leave');
    await hand.at('mark').waitFor();
  });

  chapter('by the keyboard alone: the cursor is moved, Enter begins and ends, and the sheet follows', async () => {
    await hand.tabsTo('mark');
    await hand.page.keyboard.press('Enter');
    // The focus is on the plot.
    for (let presses = 0; presses < 3; presses += 1) await hand.page.keyboard.press('ArrowRight');
    await hand.page.keyboard.press('Enter');
    await hand.reads('marking', /now tap where it ends/);
    for (let presses = 0; presses < 5; presses += 1) await hand.page.keyboard.press('ArrowRight');
    await hand.page.keyboard.press('Enter');
    await hand.reads('marking', /Marked: /);
    await hand.tabsTo('mark-exclude');
    await hand.page.keyboard.press('Enter');
    await hand.at('exclude-sheet').waitFor();
    await hand.tabsTo('exclude-reason');
    await hand.page.keyboard.type(`keys, ${size}`);
    await hand.tabsTo('exclude-send');
    await hand.page.keyboard.press('Enter');
    await hand.hears('channel-plot', /1 excluded, hatched/);
    const [made] = await inForce();
    // Five presses of a hundredth of what is shown.
    expect((Number(made?.endUtcMs) - Number(made?.startUtcMs)) / (night.to - night.from)).toBeCloseTo(0.05, 2);
    await hand.asks('POST', `/exclusions/${made?.id ?? ''}/withdraw`, { body: { reason: 'the end of the test' } });
  });

  chapter('from a moment of the data to the same moment of the replay, where the room goes along with the time', async () => {
    await hand.goes(`/runs/${runId}/data?at=${new Date(night.from + 300_000).toISOString()}`, 'channel-plot');
    await hand.tapsOn('This moment in the replay', 'link');
    await hand.at('replay-screen').waitFor();
    const clock = await hand.reads('replay-clock');
    expect(await hand.page.getByTestId('replay-alarm').count()).toBe(0);
    const temperature = await hand.reads('replay-surrounding-box temperature', /19\.\d+ °C/);
    // A finger on the slider: another moment, another temperature.
    await new Thumb(hand).taps(hand.at('time-slider'), 0.8);
    expect(await hand.readsOther('replay-clock', clock)).toMatch(/^\d\d:\d\d:\d\d$/);
    await hand.readsOther('replay-surrounding-box temperature', temperature);
    // At the beginning, before the first sample, it says that there is none or what it was; keys move on from there.
    await hand.at('time-slider').focus();
    await hand.page.keyboard.press('Home');
    await hand.reads('replay-surrounding-air pressure', /no data|1013\.\d+ hPa/);
    // And back to the data, at another moment than the one that was left.
    await hand.page.keyboard.press('End');
    const end = await hand.reads('replay-clock');
    await hand.tapsOn('The data at this moment', 'link');
    await hand.reads('plot-time', end);
    await hand.page.goBack();
    await hand.at('replay-screen').waitFor();
  });

  chapter('alarms are marked on the night, lead to their moment, and stand as long as they stood', async () => {
    await hand.reads('replay-alarms', /Clock stepped.*, to come/);
    await hand.taps('replay-alarm-row');
    await hand.reads('replay-alarm', 'Clock stepped');
    await hand.reads('replay-alarms', /, at this moment/);
    await hand.at('time-slider').focus();
    await hand.page.keyboard.press('Home');
    await hand.reads('replay-alarms', /, to come/);
    await hand.at('replay-alarm').waitFor({ state: 'detached' });
    await hand.shootsThemes('replay-room', async () => {
      await hand.goes(`/runs/${runId}/replay?at=${new Date(night.from + 850_000).toISOString()}`, 'replay-alarm');
      await hand.reads('replay-surrounding-box temperature', /°C/);
    });
  });

  chapter('a hundred thousand samples under the thumb stay fluid, with the room beside them', async () => {
    await hand.goes(`/runs/${runId}/data?channel=${fine}`, 'channel-plot');
    await canvasOf('pane-air pressure').waitFor();
    await hand.tapsOn('Show a shorter time');
    await until(() => hand.page.url().includes('from='), 'the stretch to be shown');
    expect((await read(lab(), `${runId}/samples?channelId=${fine}&points=10`)).total).toBeGreaterThan(200_000);
    const frames = await framesWhile(hand, () => new Thumb(hand).strokes(canvasOf('deflection-plot'), 0.8, 0.2, 60));
    const sorted = frames.sort((a, b) => a - b);
    const [middle = Infinity, late = Infinity] = [0.5, 0.95].map((share) => sorted[Math.floor(share * sorted.length)]);
    process.stdout.write(
      `     ${size}: ${String(frames.length)} frames, one in ${middle.toFixed(1)} ms (median), ${late.toFixed(1)} ms (95 %)\n`,
    );
    // A screen draws 60 times a second where nothing else goes on; with a full machine it is still a motion at 10.
    expect(frames.length).toBeGreaterThan(10);
    expect(middle).toBeLessThan(100);
  });

  chapter('it is looked at in every theme', async () => {
    await hand.shootsThemes('plots', async () => {
      await hand.goes(`/runs/${runId}/data?at=${new Date(night.from + 900_000).toISOString()}`, 'channel-plot');
      await hand.reads('pane-reading-air pressure', /hPa/);
    });
  });
});
