import { demoIds } from '@/db/demo/seed';
import type { ChainedEvent } from '@/shared/archive/run-records';
import { findings, themes } from './support/axe';
import { chapters, Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';
import { issued, read, shortNight, started } from './support/night';

/** A server that finds a run it cannot read: the page that stayed open says so by itself, nothing on it looks alive, and a person ends the run. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
let [phone, wide]: Hand[] = [];
let runId: string;
const chapter = chapters(() => phone as Hand);
const hands = () => [phone as Hand, wide as Hand];

beforeAll(async () => {
  await lab().server.arm(20);
  runId = await started(lab(), await issued(lab(), shortNight('Night of another version', 2)));
  [phone, wide] = [new Hand(await lab().open('phone', 'operator')), new Hand(await lab().open('wide', 'keeper'))];
}, 60_000);
afterAll(async () => {
  for (const { browser } of hands()) {
    // What the page asks for while the server is away is answered so, and a browser notes that as an error of its own.
    expect(browser.errors.filter((words) => !/status of 503/.test(words))).toEqual([]);
    await lab().close(browser);
  }
});

chapter('another version has written the run: after the restart the open page says what happened and what can be done', async () => {
  await lab().pass(600);
  for (const hand of hands()) await hand.goes(`/runs/${runId}`, 'run-screen');
  await lab().server.services.idle();
  // As if a newer version had driven the run until the restart: what this process saves after that is of its own version.
  await lab().server.intervene(runId, 'hold').expect(202);
  await until(async () => (await read(lab(), runId)).state === 'held', 'the run to be held');
  await lab().server.services.idle();
  await lab().server.services.database.pool.query('update runs set chart_version = 99 where id = $1', [runId]);
  await lab().restarts(5);
  for (const hand of hands()) {
    await hand.at('quarantine-screen').waitFor();
    await hand.reads(
      'quarantine-why',
      /another version of the run engine \(99; this one reads \d+\)\. Look at the rig, then end the run\./,
    );
    await hand.sees('Nothing moves.');
    for (const alive of ['control-bar', 'time-left', 'link-chip']) expect(await hand.at(alive).count()).toBe(0);
  }
});

chapter('it is readable in every theme, for axe too, and nothing on it is too small for a thumb', async () => {
  for (const hand of hands()) {
    for (const theme of themes) expect(await findings(hand, theme)).toEqual([]);
    const { height = 0 } = (await hand.at('end-run').boundingBox()) ?? {};
    expect(height).toBeGreaterThanOrEqual(44);
    await hand.shootsThemes('quarantine', () => hand.goes(`/runs/${runId}`, 'quarantine-screen'));
    await hand.taps('end-run');
    await hand.at('end-run-sheet').waitFor();
    for (const theme of themes) expect(await findings(hand, theme)).toEqual([]);
    await hand.shoots('quarantine-sheet');
    await hand.page.keyboard.press('Escape');
    await hand.at('end-run-sheet').waitFor({ state: 'detached' });
  }
});

chapter('whoever looked at the rig ends the run: both pages show it ended, its log says by whom, and the rig is free', async () => {
  const [operator, keeper] = hands() as [Hand, Hand];
  await keeper.taps('end-run');
  await keeper.taps('end-run-confirm');
  for (const hand of [keeper, operator]) {
    await hand.at('result-screen').waitFor();
    await hand.reads('headline', /Ended by Casimir Thornquist\./);
    await hand.shoots('quarantine-ended');
  }
  const events = ((await read(lab(), `${runId}/events?limit=500`)) as { items: ChainedEvent[] }).items;
  expect(events.at(-1)).toMatchObject({ kind: 'failed', data: { code: 'given-up', by: 'Casimir Thornquist' } });
  const { activeRun } = (await lab().server.as('viewer', 'GET', `/labs/${demoIds.lab}/rigs/${demoIds.rig}`).expect(200)).body;
  expect(activeRun).toBeNull();
});
