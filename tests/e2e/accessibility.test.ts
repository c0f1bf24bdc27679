import { demoIds } from '@/db/demo/seed';
import { reportCondition } from '@/server/store/alarms';
import { sizes, type Size } from '../support/browser';
import { findings, themes } from './support/axe';
import { bringsIn, checksAnother, sendsInVain } from './support/brought-in';
import { Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';
import { finishedNight, issued, read, shortNight, started } from './support/night';

/** Every screen by axe in the three themes, targets a thumb can meet, and pages that fit the narrowest phone. */

jest.setTimeout(240_000);
const lab = labOfThisFile();

interface Place {
  name: string;
  path: string;
  arrives: string;
  /** What to do there before looking. */
  first?: (hand: Hand) => Promise<void>;
}

let finishedId: string;
let runningId: string;
let [alarmId, nightUtcMs] = ['', 0];
beforeAll(async () => {
  finishedId = await finishedNight(lab(), 2);
  const evaluations = `/labs/${demoIds.lab}/runs/${finishedId}/evaluations`;
  await lab().server.as('analyst', 'POST', evaluations).send({}).expect(202);
  await until(async () => (await lab().server.as('viewer', 'GET', evaluations)).body.items[0]?.state === 'done', 'the evaluation');
  nightUtcMs = await bringsIn(lab(), finishedId);
  runningId = await started(lab(), await issued(lab(), shortNight('Going on', 12)));
  await lab().pass(60);
  const { services } = lab().server;
  const place = { labId: demoIds.lab, rigId: demoIds.rig, code: 'clock-stepped' as const, subject: 'host' };
  const found = { met: true, words: 'The clock of the server jumped by 1200 ms.', runId: runningId, utcMs: services.clock.utcMs() };
  await services.database.db.transaction((tx) => reportCondition(tx, place, found));
  alarmId = (await lab().server.as('viewer', 'GET', `/labs/${demoIds.lab}/alarms`).expect(200)).body.items[0].id;
}, 120_000);

const opened = (testId: string, sheet: string) => async (hand: Hand) => {
  await hand.taps(testId);
  await hand.at(sheet).waitFor();
};

const checksNight = (hand: Hand) => checksAnother(hand, nightUtcMs);
const says = (testId: string, words?: string) => async (hand: Hand) => void (await hand.reads(testId, words));

const publicPlaces: Place[] = [
  { name: 'sign-in', path: '/sign-in', arrives: 'sign-in' },
  { name: 'forgotten-password', path: '/forgotten-password', arrives: '' },
  { name: 'reset-password', path: '/reset-password?token=none', arrives: '' },
  { name: 'invitation', path: '/invitations/none', arrives: '' },
  { name: 'door', path: '/doors/none', arrives: '' },
];

function places(): Place[] {
  const rig = `/rigs/${demoIds.rig}`;
  const protocol = `/protocols/${demoIds.overnightProtocol}`;
  return [
    { name: 'rigs', path: '/rigs', arrives: 'rigs-screen' },
    { name: 'rig', path: rig, arrives: 'rig-screen' },
    { name: 'stations', path: `${rig}/stations`, arrives: 'torque-plot' },
    { name: 'rig-revisions', path: `${rig}/revisions`, arrives: '' },
    { name: 'light-spot', path: `${rig}/light-spot`, arrives: 'spot-missing' },
    { name: 'send-pictures', path: `${rig}/send-pictures`, arrives: 'send-missing' },
    { name: 'link', path: `${rig}/link`, arrives: 'link-screen', first: (hand) => hand.tapsOn('Serial line', 'radio') },
    {
      name: 'first-move',
      path: `${rig}/first-move`,
      arrives: 'first-move-screen',
      first: says('conditions'),
    },
    { name: 'start', path: `${rig}/start`, arrives: 'start-screen', first: says('start-checks') },
    { name: 'protocols', path: '/protocols', arrives: 'protocols-screen' },
    { name: 'new-protocol', path: '/protocols/new', arrives: 'new-protocol-screen' },
    { name: 'editor', path: protocol, arrives: 'editor', first: (hand) => hand.taps('step-2') },
    { name: 'add-step', path: protocol, arrives: 'editor', first: opened('add-step', 'add-step-sheet') },
    { name: 'issue', path: protocol, arrives: 'editor', first: opened('issue', 'issue-sheet') },
    { name: 'rehearse', path: protocol, arrives: 'editor', first: opened('rehearse', 'rehearse-sheet') },
    { name: 'more', path: protocol, arrives: 'editor', first: opened('open-more', 'more-sheet') },
    { name: 'revisions', path: `/protocols/${demoIds.shortProtocol}/revisions`, arrives: 'protocol-revisions' },
    { name: 'runs', path: '/runs', arrives: 'runs-screen', first: says('run-row') },
    { name: 'run', path: `/runs/${runningId}`, arrives: 'run-screen', first: says('link-chip', 'live') },
    { name: 'result', path: `/runs/${finishedId}`, arrives: 'result-screen', first: says('g-panel') },
    { name: 'replay', path: `/runs/${finishedId}/replay`, arrives: 'replay-screen' },
    { name: 'step-log', path: `/runs/${finishedId}/log`, arrives: 'step-log', first: opened('events-3', 'chain-head') },
    { name: 'data', path: `/runs/${finishedId}/data`, arrives: 'data-screen', first: says('kept-files', 'night.csv') },
    { name: 'marking', path: `/runs/${finishedId}/data`, arrives: 'channel-plot', first: opened('mark', 'marking') },
    { name: 'import', path: `/runs/${finishedId}/import`, arrives: 'import-screen', first: says('unfinished', 'another.csv') },
    { name: 'findings', path: `/runs/${finishedId}/import?again`, arrives: 'import-screen', first: checksNight },
    { name: 'uploading', path: `/runs/${finishedId}/import?uploads`, arrives: 'import-screen', first: sendsInVain },
    {
      name: 'evaluation',
      path: `/runs/${finishedId}/evaluation`,
      arrives: 'evaluation-screen',
      first: (hand) => hand.taps('budget-table-toggle'),
    },
    { name: 'door-card', path: `${rig}/door`, arrives: 'door-screen' },
    { name: 'calendar', path: '/calendar', arrives: 'calendar-screen', first: says('room') },
    { name: 'schedule', path: '/calendar', arrives: 'calendar-screen', first: opened('schedule-a-run', 'schedule-confirm') },
    { name: 'lab', path: '/lab', arrives: 'lab-screen', first: says('on-call', 'Whoever') },
    { name: 'on-call', path: '/lab', arrives: 'lab-screen', first: opened('change-on-call', 'on-call-sheet') },
    { name: 'broker', path: rig, arrives: 'rig-screen', first: opened('add-broker', 'broker-sheet') },
    { name: 'calibration', path: rig, arrives: 'rig-screen', first: opened('add-calibration', 'calibration-sheet') },
    { name: 'camera', path: rig, arrives: 'rig-screen', first: opened('add-camera', 'camera-sheet') },
    { name: 'limit', path: rig, arrives: 'rig-screen', first: opened('add-limit', 'limit-sheet') },
    { name: 'retention', path: '/lab/retention', arrives: 'retention-screen', first: says('kept-channels', 'for ever') },
    {
      name: 'audit',
      path: '/lab/audit',
      arrives: 'audit-screen',
      first: async (hand) => {
        await hand.reads('audit-check', 'whole');
        await hand.taps(hand.at('audit-entry').getByRole('button'));
      },
    },
    { name: 'alarms', path: '/alarms', arrives: 'alarms-screen', first: says('standing-alarms') },
    { name: 'alarm', path: `/alarms/${alarmId}`, arrives: 'alarm-screen', first: opened('shelve', 'reason-sheet') },
  ];
}

async function visit(hand: Hand, { path, arrives, first }: Place): Promise<void> {
  const sheet = hand.page.locator('dialog [data-testid="sheet-close"]');
  if (hand.page.url().endsWith(path) && (await sheet.isVisible())) await hand.taps(sheet);
  else if (await hand.page.locator('nav').first().isVisible()) await hand.leads(path);
  else await hand.page.goto(path);
  // The sign-in page stands as plain HTML first, and its program draws it anew.
  await hand.page.waitForFunction(() =>
    Object.keys(document.querySelector('main, [role=main]') ?? {}).some((key) => key.startsWith('__react')),
  );
  await (arrives === '' ? hand.page.getByRole('heading', { level: 1 }) : hand.at(arrives)).first().waitFor();
  await first?.(hand);
}

/** What leads sideways at 320 px. */
async function narrow(hand: Hand, { name }: Place): Promise<string[]> {
  await hand.page.setViewportSize({ width: 320, height: 568 });
  if (['run', 'editor', 'evaluation', 'start', 'rig'].includes(name)) await hand.shoots(`narrow-${name}`);
  let found = await sideways(hand);
  // A plot follows its place a moment later.
  for (let looks = 0; looks < 20 && found.length > 0; looks += 1) {
    await hand.page.waitForTimeout(50);
    found = await sideways(hand);
  }
  await hand.page.setViewportSize(sizes.phone);
  return found.map((what) => `sideways: ${what}`);
}

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  beforeAll(async () => {
    hand = new Hand(await lab().open(size));
  });
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  test(`axe finds nothing serious on any screen${size === 'phone' ? ' in any theme, and at 320 px nothing leads sideways' : ''}`, async () => {
    const found: Record<string, string[]> = {};
    for (const place of [...publicPlaces, ...places()]) {
      if (place.name === 'rigs') await lab().enter(hand.browser, 'owner');
      await visit(hand, place);
      const all = size === 'phone' ? await narrow(hand, place) : [];
      // Colours do not depend on the size: the phone sees all themes, the wide screen the dark one.
      for (const theme of size === 'phone' ? themes : (['dark'] as const)) all.push(...(await findings(hand, theme)));
      if (all.length > 0) found[place.name] = all;
    }
    expect(found).toEqual({});
  });

  test('a theme is chosen with one tap and stays on this device', async () => {
    await lab().enter(hand.browser, 'owner');
    await hand.goes('/lab', 'lab-screen');
    for (const theme of ['red', 'light', 'dark'] as const) {
      await hand.follows('/lab', 'lab-screen');
      await hand.taps(`theme-${theme}`);
      await hand.goes(`/runs/${runningId}`, 'run-screen');
      expect(await hand.page.evaluate(() => document.documentElement.className)).toContain(`theme-${theme}`);
      await hand.reads('link-chip', 'live');
      await hand.shoots(`run-${theme}`);
    }
  });

  test('on a run every target is 48 px or more; hold and stop are 64 px high and keep 16 px from each other', async () => {
    await lab().enter(hand.browser, 'operator');
    await hand.goes(`/runs/${runningId}`, 'run-screen');
    await hand.reads('link-chip', 'live');
    expect(await tooSmall(hand)).toEqual([]);
    const [hold, stop, bar] = await Promise.all(['hold', 'stop', 'control-bar'].map((testId) => hand.at(testId).boundingBox()));
    if (!hold || !stop || !bar) throw new Error('hold, stop and their bar are on the page');
    expect(Math.min(hold.height, stop.height)).toBeGreaterThanOrEqual(64);
    expect(stop.width).toBeGreaterThanOrEqual(bar.width / 2);
    expect(stop.x - (hold.x + hold.width)).toBeGreaterThanOrEqual(16);
    // Stop stays in sight wherever the page is scrolled to.
    expect(stop.y + stop.height).toBeLessThanOrEqual(sizes[size].height);
    await hand.goes(`/rigs/${demoIds.rig}/start`, 'start-screen');
    await hand.reads('start-checks');
    expect(await tooSmall(hand)).toEqual([]);
  });

  test('a held run, too', async () => {
    await lab().server.as('operator', 'POST', `/labs/${demoIds.lab}/runs/${runningId}/hold`).send({}).expect(202);
    await until(async () => (await read(lab(), runningId)).state === 'held', 'the run to be held');
    await hand.goes(`/runs/${runningId}`, 'run-screen');
    await hand.at('resume').waitFor();
    expect([...(await findings(hand, 'dark')), ...(await tooSmall(hand))]).toEqual([]);
    await hand.taps('resume');
    await hand.at('resume-sheet').waitFor();
    expect([...(await findings(hand, 'dark')), ...(await tooSmall(hand))]).toEqual([]);
    await hand.keeps('resume-confirm');
    await hand.at('resume-sheet').waitFor({ state: 'detached' });
  });
});

test('axe sees what is wrong: words that can hardly be read, and a picture without a name', async () => {
  const hand = new Hand(await lab().open('phone'));
  await visit(hand, publicPlaces[0] as Place);
  await hand.page.evaluate(() => {
    const faint = document.createElement('p');
    faint.textContent = 'faint';
    // By the object model: the content policy takes no style out of markup.
    Object.assign(faint.style, { color: '#333', background: '#222' });
    const nameless = document.createElement('div');
    nameless.setAttribute('role', 'img');
    document.querySelector('main, [role=main]')?.append(faint, nameless);
  });
  const found = [...(await findings(hand, 'dark')), ...(await findings(hand, 'red'))].map((finding) => finding.split(' at ')[0]);
  expect(found).toEqual(['dark: color-contrast', 'dark: role-img-alt', 'red: color-contrast']);
  await lab().close(hand.browser);
});

/** Targets below 48 × 48 px that are on the page, each as what it is. */
function tooSmall(hand: Hand): Promise<string[]> {
  return hand.page.evaluate(() => {
    const targets =
      'a[href], button, input:not([type=file]), select, textarea, [role=button], [role=link], [role=switch], [role=checkbox], [role=radio]';
    return [...document.querySelectorAll<HTMLElement>(targets)].flatMap((element) => {
      const { width, height } = element.getBoundingClientRect();
      if (width === 0 || height === 0 || (width >= 47.5 && height >= 47.5)) return [];
      return [
        `${element.getAttribute('aria-label') ?? element.textContent ?? element.tagName}: ${width.toFixed(0)} × ${height.toFixed(0)}`,
      ];
    });
  });
}

/** What reaches over the right edge and can be reached by scrolling sideways only, but for tables and previews that scroll in themselves. */
function sideways(hand: Hand): Promise<string[]> {
  return hand.page.evaluate(() => {
    const width = document.documentElement.clientWidth;
    const scrolls = (element: Element | null): boolean => {
      if (element === null) return false;
      const { overflowX } = getComputedStyle(element);
      const own = (overflowX === 'auto' || overflowX === 'scroll') && element.getAttribute('role') === 'region';
      return own || scrolls(element.parentElement);
    };
    return [...document.querySelectorAll<HTMLElement>('body *')]
      .filter(
        (element) =>
          element.getBoundingClientRect().right > width + 1 &&
          element.closest('.sr-only, svg, [aria-hidden=true]') === null &&
          !scrolls(element),
      )
      .map((element) => `${element.tagName} ${element.getAttribute('data-testid') ?? ''} ${(element.textContent ?? '').slice(0, 40)}`)
      .slice(0, 5);
  });
}
