import { readFileSync } from 'node:fs';
import { parse } from 'csv-parse/sync';
import type { StepRowView } from '@/shared/contracts/runs';
import type { StepNoteView } from '@/shared/contracts/step-notes';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand, plain } from './support/hand';
import { labOfThisFile } from './support/lab';
import { finishedNight, read } from './support/night';

/** Story 6: the morning after a finished night; what came of it, and the step log behind it. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
let runId: string;
beforeAll(async () => {
  runId = await finishedNight(lab());
}, 120_000);

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

  chapter('the list of runs leads to the result: that it finished, when, and how many dwells were good', async () => {
    await hand.goes('/runs', 'runs-screen');
    await hand.sees('Short night');
    await hand.shoots('runs');
    await hand.taps('run-row');
    await hand.at('result-screen').waitFor();
    expect(await hand.reads('headline', 'Finished at')).toMatch(/Finished at \d\d:\d\d/);
    expect(await hand.reads('headline')).toMatch(/Europe\/Zurich, after 56 min/);
    await hand.reads('good-dwells', /^4 of 4 dwells are good/);
    const ticks = await hand.reads('ticks', /Chain of \d+ events whole/);
    expect(ticks).toMatch(/Home edge .*0\.\d{3}° allowed/);
    expect(ticks).toMatch(/\d+\.\d % of the samples, longest gap/);
    await hand.hears('night-strip', /2 near dwells and 2 far dwells.*4 of 4 dwells done.*The solid line is the measured deflection/);
    await hand.shoots('result');
  });

  chapter('once evaluated it says what near minus far is, how the pendulum did, and what the next night would bring', async () => {
    // Two minutes after the end of the run it is evaluated by itself.
    if (size === 'phone') await lab().pass(180);
    await hand.at('g-value').waitFor();
    expect(await hand.reads('near-far', /mrad/)).toMatch(/\(\d+\).mrad.*The first evaluated night on this rig/);
    expect(await hand.reads('ticks', /of the prediction|the prediction/)).toMatch(/Clock off by/);
    await hand.reads('pendulum', /quality factor Q.*drift of the zero at the start.*µrad\/h/);
    await hand.reads('next-night', /u\(G\)\/G/);
    await hand.reads('may-go-in', /^May I go in\? No ?Armed for Ilse Marrowby/);
    await hand.shoots('morning');
  });

  chapter('the step log gives planned and actual times with their uncertainty', async () => {
    await hand.tapsOn('Step log', 'link');
    await hand.at('step-log').waitFor();
    await hand.sees('10 rows');
    const rows = hand.page.getByTestId('step-row');
    expect(await rows.count()).toBe(10);
    const swing = plain((await rows.nth(2).textContent()) ?? '');
    expect(swing).toMatch(/Swing to far/);
    // Start and end: a clock time, its standard uncertainty, the plan and the difference.
    expect(swing.match(/\d\d:\d\d:\d\d\.\d{3} \d{3}± \d+ µs/g)).toHaveLength(2);
    expect(swing.match(/plan \d\d:\d\d:\d\d[+−]\d+ ms/g)).toHaveLength(2);
    await hand.shoots('step-log');
    await hand.tapsOn('UTC', 'radio');
    await hand.sees('times in UTC');
    await hand.taps('events-3');
    await hand.sees(/events\. Head of the chain/);
  });

  chapter('the filter leaves what was asked for, and says so', async () => {
    if (size === 'phone') await hand.taps('filter');
    await hand.chooses('filter-kind', 'dwell');
    await hand.sees('4 of 10 rows');
    await hand.chooses('filter-station', 'near');
    await hand.sees('2 of 10 rows');
    expect(await hand.page.getByTestId('step-row').count()).toBe(2);
    await hand.chooses('filter-kind', 'home');
    await hand.sees('No row like that');
    await hand.shoots('filter');
    await hand.tapsOn('Show all rows');
    await hand.sees('10 rows');
  });

  chapter('the JSON holds it for a program, under the names of the CSV', async () => {
    const [download] = await Promise.all([hand.page.waitForEvent('download'), hand.taps('steps-json')]);
    expect(download.suggestedFilename()).toMatch(/\.json$/);
    const file = JSON.parse(readFileSync(await download.path(), 'utf8')) as { steps: { path: string; start_utc: string }[] };
    const { items } = (await read(lab(), `${runId}/steps`)) as { items: StepRowView[] };
    expect(file.steps.map(({ path }) => path)).toEqual(items.map(({ path }) => path));
  });

  chapter('the CSV holds the same log', async () => {
    const [download] = await Promise.all([hand.page.waitForEvent('download'), hand.taps('steps-csv')]);
    expect(download.suggestedFilename()).toMatch(/\.csv$/);
    const table: Record<string, string>[] = parse(readFileSync(await download.path(), 'utf8'), { columns: true });
    const { items } = (await read(lab(), `${runId}/steps`)) as { items: StepRowView[] };
    expect(table).toHaveLength(items.length);
    const facts = table.map((row) => ({
      seq: Number(row.seq),
      path: row.path,
      kind: row.kind,
      station: row.station,
      outcome: row.outcome,
      startUtcMs: Date.parse(row.start_utc ?? ''),
      endUtcMs: Date.parse(row.end_utc ?? ''),
      uStartS: Number(row.u_start_s),
      angleEndDeg: Number(row.angle_end_deg),
    }));
    expect(facts).toEqual(
      items.map((item) => ({
        seq: item.seq,
        path: item.path,
        kind: item.kind,
        station: item.station,
        outcome: item.outcome,
        startUtcMs: Math.floor(item.startUtcMs),
        endUtcMs: Math.floor(item.endUtcMs ?? NaN),
        uStartS: item.uStartS,
        angleEndDeg: item.angleEndDeg,
      })),
    );
  });

  chapter('a row is annotated, and says so', async () => {
    const { items } = (await read(lab(), `${runId}/notes`)) as { items: StepNoteView[] };
    const count = 1 + items.filter(({ seq }) => seq === 2).length;
    const row = hand.page.getByTestId('step-row').nth(1);
    await hand.taps('events-2');
    await hand.types('note-text', `the lamp flickered, ${size}`);
    await hand.taps('note-send');
    await row
      .getByTestId('row-noted')
      .getByText(count === 1 ? '1 note' : `${String(count)} notes`)
      .waitFor();
    await hand.reads('row-notes', new RegExp(`the lamp flickered, ${size}.*by Tam Ferrowdale`));
    expect(await hand.at('note-text').inputValue()).toBe('');
    await hand.shoots('note');
  });

  chapter('a dwell is excluded with a reason, from when to when, is hatched on the data page, and is withdrawn again', async () => {
    const { items } = (await read(lab(), `${runId}/steps`)) as { items: StepRowView[] };
    const seq = items.find(({ kind }) => kind === 'dwell')?.seq ?? 0;
    await hand.taps(`events-${String(seq)}`);
    await hand.taps('exclude');
    await hand.at('exclude-sheet').waitFor();
    expect(await hand.isEnabled('exclude-send')).toBe(false);
    await hand.types('exclude-from', '-1');
    await hand.sees('a number of seconds from 0 to');
    await hand.types('exclude-from', '30');
    await hand.types('exclude-reason', `a door, ${size}`);
    await hand.shoots('exclude');
    await hand.taps('exclude-send');
    await hand.reads('row-excluded', 'partly excluded');
    await hand.sees(`a door, ${size}`);
    await hand.follows(`/runs/${runId}/data`, 'channel-plot');
    await hand.hears('channel-plot', /1 excluded, hatched/);
    await hand.shoots('excluded');
    // By the keyboard alone: the one exclusion in force is withdrawn.
    await hand.tabsTo('withdraw');
    await hand.page.keyboard.press('Enter');
    await hand.at('withdraw-sheet').waitFor();
    await hand.tabsTo('withdraw-reason');
    await hand.page.keyboard.type(`it was shut, ${size}`);
    await hand.tabsTo('withdraw-send');
    await hand.page.keyboard.press('Enter');
    await hand.sees(new RegExp(`Withdrawn .* by .*: it was shut, ${size}`));
    await hand.hears('channel-plot', /far below\. /);
  });

  chapter('the replay shows table, deflection and step of any moment, by thumb, by keys and by its address', async () => {
    await hand.goes(`/runs/${runId}/replay`, 'replay-screen');
    const slider = hand.page.getByTestId('time-slider');
    await slider.focus();
    await hand.page.keyboard.press('End');
    const end = await hand.reads('replay-clock');
    await hand.page.keyboard.press('Home');
    const [begin, step] = [await hand.reads('replay-clock'), await hand.reads('replay-step')];
    expect(step).toBe('Home: finding the edge');
    await hand.page.keyboard.press('PageUp');
    await hand.reads('replay-step', /^Swing to near/);
    await hand.taps('replay-next');
    await hand.reads('replay-step', /^Swing to far/);
    await hand.taps('replay-next');
    await hand.reads('replay-step', /^Dwell, far side/);
    const box = await slider.boundingBox();
    if (box === null) throw new Error('the slider is on the page');
    await hand.page.mouse.click(box.x + box.width / 2, box.y + box.height / 2);
    const middle = await hand.reads('replay-clock');
    const share = Number(await slider.getAttribute('aria-valuenow'));
    expect(share).toBeGreaterThan(400);
    expect(share).toBeLessThan(600);
    expect(new Set([begin, middle, end]).size).toBe(3);
    await hand.shoots('replay');
    await hand.taps('replay-link');
    await hand.page.waitForURL(/replay\?at=/);
    await hand.goes(hand.page.url().replace(/^https?:\/\/[^/]+/, ''), 'replay-screen');
    await hand.reads('replay-clock', middle);
    // Motion is reduced in this browser: from step to step until the end.
    await slider.focus();
    await hand.page.keyboard.press('End');
    await hand.taps('replay-previous');
    await hand.taps('replay-play');
    await hand.reads('replay-clock', end);
  });
});
