import { readFileSync } from 'node:fs';
import Ajv from 'ajv/dist/2020';
import addFormats from 'ajv-formats';
import type { Download } from 'playwright-core';
import { demoIds, demoPassword } from '@/db/demo/seed';
import { protocolDocumentSchema } from '@/shared/protocol/document';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand } from './support/hand';
import { labOfThisFile, person } from './support/lab';

/** Story 1: a protocol is composed, issued, compared, taken out and brought back. */

jest.setTimeout(120_000);
const lab = labOfThisFile();

const textOf = async (download: Download) => readFileSync(await download.path(), 'utf8');

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  const chapter = chapters(() => hand);
  beforeAll(async () => {
    hand = new Hand(await lab().open(size));
  });
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  chapter('signs in and begins from a template', async () => {
    await hand.goes('/', 'sign-in');
    await hand.shoots('sign-in');
    await hand.types('sign-in-email', person('operator').email);
    await hand.types('sign-in-password', demoPassword);
    await hand.taps('sign-in');
    await hand.at('rigs-screen').waitFor();
    await hand.tapsOn('Protocols', 'link');
    await hand.taps('new-protocol');
    await hand.at('template-near-far-short').waitFor();
    await hand.shoots('new-protocol');
    await hand.taps('template-near-far-short');
    // A beat is two periods of 420 s; the protocol is six pairs of beats after home, a first swing and a kick with three periods: 12 · 840 s, 1477 s and a little.
    expect(await hand.reads('total-time', '3 h 13 min')).toBe('3 h 13 min');
    await hand.hears('swing-strip', /6 near dwells and 6 far dwells/);
  });

  chapter('adds, nests, moves, duplicates and deletes steps, and takes it all back', async () => {
    await hand.taps('step-4');
    await hand.taps('add-step');
    await hand.shoots('add-step');
    await hand.tapsOn('After', 'radio');
    await hand.taps('add-settle');
    await hand.at('step-5').waitFor();
    const added = await hand.reads('total-time', /^3 h 2\d min/);
    await hand.taps('nest');
    await hand.at('step-5.1').waitFor();
    expect(await hand.reads('step-5')).toContain('Repeat');
    const nested = await hand.readsOther('total-time', added);
    await hand.taps('duplicate');
    await hand.at('step-6').waitFor();
    const doubled = await hand.readsOther('total-time', nested);
    await hand.taps('delete');
    await hand.at('step-6').waitFor({ state: 'detached' });
    await hand.taps('undo');
    await hand.at('step-6').waitFor();
    await hand.reads('total-time', doubled);
    await hand.taps('redo');
    await hand.at('step-6').waitFor({ state: 'detached' });
    // Up from behind a repeat is into its end.
    await hand.taps('move-up');
    await hand.reads('step-4.5.1', 'Settle');
    await hand.readsOther('total-time', added);
    for (let times = 0; times < 5 && (await hand.isEnabled('undo')); times += 1) await hand.taps('undo');
    expect(await hand.reads('total-time', '3 h 13 min')).toBe('3 h 13 min');
    await hand.at('step-5').waitFor({ state: 'detached' });
  });

  chapter('says that a beat pumps the pendulum, and says nothing more once it does not', async () => {
    await openDetails(hand, '4.2');
    await hand.types('dwell-periods', '1.5');
    await closeDetails(hand);
    await hand.at('finding-cycle-pumps').waitFor();
    expect(await hand.reads('finding-cycle-pumps')).toMatch(/1\.50 periods, which is near an odd number of half periods.*beat_periods 2/);
    await hand.hears('swing-strip', /6 near dwells and 6 far dwells/);
    await hand.readsOther('total-time', '3 h 13 min');
    await hand.at('finding-cycle-pumps').scrollIntoViewIfNeeded();
    await hand.shoots('advice');
    await hand.taps('undo');
    await hand.at('finding-cycle-pumps').waitFor({ state: 'detached' });
  });

  chapter('refuses to plan what the rig does not have, at the step, and takes another number at once', async () => {
    await openDetails(hand, '4');
    await hand.types('repeat-times', 'two');
    await hand.sees('a number, for example 2.5');
    await hand.types('repeat-times', '2');
    await closeDetails(hand);
    expect(await hand.reads('total-time', '1 h 21 min')).toMatch(/1 h 21 min/);
    await hand.shoots('editor');
  });

  chapter('issues two revisions and shows what differs between them', async () => {
    await hand.taps('issue');
    await hand.types('issue-note', 'Two pairs, to look at');
    await hand.shoots('issue');
    await hand.taps('issue-confirm');
    await hand.sees('Revision 1 is issued.');
    await openDetails(hand, '4');
    await hand.types('repeat-times', '3');
    await closeDetails(hand);
    await hand.taps('issue');
    await hand.sees('Changes since revision 1');
    expect(await hand.reads('differences')).toMatch(/repeat: times.*was 2.*is 3/);
    await hand.taps('issue-confirm');
    await hand.sees('Revision 2 is issued.');
    await hand.taps('open-more');
    await hand.taps('open-revisions');
    await hand.at('protocol-revisions').waitFor();
    expect(await hand.at('compare-from').inputValue()).toBe('1');
    expect(await hand.at('compare-to').inputValue()).toBe('2');
    expect(await hand.reads('differences')).toMatch(/repeat: times.*was 2.*is 3/);
    await hand.at('compare-from').scrollIntoViewIfNeeded();
    await hand.shoots('revisions');
    await hand.chooses('compare-from', '2');
    await hand.sees('Both sides are the same one');
  });

  chapter('takes the protocol out as JSON that keeps to the published schema, and brings it back', async () => {
    await hand.page.goBack();
    await hand.at('editor').waitFor();
    await hand.taps('open-more');
    const [download] = await Promise.all([hand.page.waitForEvent('download'), hand.taps('export-protocol')]);
    expect(download.suggestedFilename()).toBe('short-reversals.protocol.json');
    const text = await textOf(download);
    const published: object = await (await fetch(`${lab().address}/schemas/protocol-1.json`)).json();
    const ajv = addFormats(new Ajv({ strict: false }));
    expect(ajv.validate(published, JSON.parse(text))).toBe(true);
    const document = protocolDocumentSchema.parse(JSON.parse(text));
    expect(document.steps[3]).toMatchObject({ kind: 'repeat', times: 3 });

    await hand.goes('/protocols/new', 'new-protocol-screen');
    await hand.taps('from-file');
    await hand.types('import-text', text.replace('"Short reversals"', '"Brought back"'));
    await hand.taps('import-read');
    await hand.at('editor').waitFor();
    await hand.sees('Brought back');
    await hand.hears('swing-strip', /3 near dwells and 3 far dwells/);
    const stored = await lab().server.as(
      'viewer',
      'GET',
      `/labs/${demoIds.lab}/protocols/${new URL(hand.page.url()).pathname.split('/').at(-1) ?? ''}`,
    );
    expect(stored.body.document).toEqual({ ...document, name: 'Brought back' });
  });
});

test('by keyboard alone a protocol is composed and issued', async () => {
  const hand = new Hand(await lab().open('wide', 'operator'));
  const { page } = hand;
  const press = async (...keys: string[]) => {
    for (const key of keys) await page.keyboard.press(key);
  };
  await hand.goes('/protocols', 'protocols-screen');
  await hand.tabsTo('new-protocol');
  await press('Enter');
  await hand.at('new-protocol-screen').waitFor();
  await hand.tabsTo('template-near-far-short');
  await press('Enter');
  await hand.at('editor').waitFor();
  await hand.reads('total-time', '3 h 13 min');

  await hand.tabsTo('step-list');
  await press('End', 'Enter');
  await page.waitForFunction(() => document.activeElement?.closest('[data-testid="editor-aside"]') != null);
  await hand.tabsTo('dwell-periods');
  await press('Control+a');
  await page.keyboard.type('3');
  await hand.reads('total-time', '3 h 55 min');

  await hand.tabsTo('add-step', 'Shift+Tab');
  await press('Enter');
  await hand.at('add-step-sheet').waitFor();
  await hand.tabsTo('add-mark');
  await press('Enter');
  await hand.at('add-step-sheet').waitFor({ state: 'detached' });
  await hand.tabsTo('step-list', 'Shift+Tab');
  await press('Alt+ArrowUp');
  await hand.reads('step-4.4', 'Mark');
  await press('Alt+ArrowLeft');
  await hand.reads('step-5', 'Mark');
  await press('Alt+ArrowRight');
  await hand.at('step-5.1').waitFor();
  await press('Control+z', 'Delete');
  await hand.at('step-5').waitFor({ state: 'detached' });
  await press('Control+z');
  await hand.reads('step-5', 'Mark');
  await press('Delete');
  await hand.at('step-5').waitFor({ state: 'detached' });

  await hand.tabsTo('issue');
  await press('Enter');
  await hand.tabsTo('issue-confirm');
  await press('Enter');
  await hand.sees('Revision 1 is issued.');
  expect(hand.browser.errors).toEqual([]);
  await lab().close(hand.browser);
});

/** At a desk the details stand beside the steps; on a phone a second tap opens them. */
async function openDetails(hand: Hand, path: string): Promise<void> {
  const row = hand.at(`step-${path}`);
  if ((await row.getAttribute('aria-selected')) !== 'true') await hand.taps(row);
  if (hand.browser.size === 'phone') await hand.taps(row);
  await hand.at('step-details').waitFor();
}

async function closeDetails(hand: Hand): Promise<void> {
  if (hand.browser.size === 'phone') await hand.taps('sheet-close');
}
