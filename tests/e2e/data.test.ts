import { strFromU8, unzipSync } from 'fflate';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { parse } from 'csv-parse/sync';
import { demoIds } from '@/db/demo/seed';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand } from './support/hand';
import { labOfThisFile } from './support/lab';
import { finishedNight, read } from './support/night';

/** Story 7: a deflection file of the night is brought in; everything that is wrong with one is said, and nothing typed is lost. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
let runId: string;
let folder: string;
/** The deflection of the night once a second: UTC ms and rad, as the archive holds it. */
let night: { utcMs: number; rad: number }[];

beforeAll(async () => {
  runId = await finishedNight(lab(), 1);
  folder = mkdtempSync(join(tmpdir(), 'evenfall-data-'));
  night = await deflectionOf(runId);
}, 120_000);
afterAll(() => rmSync(folder, { recursive: true, force: true }));

async function deflectionOf(run: string): Promise<typeof night> {
  const zip = await lab()
    .server.as('viewer', 'GET', `/labs/${demoIds.lab}/runs/${run}/archive.zip`)
    .buffer()
    .parse((res, done) => {
      const chunks: Buffer[] = [];
      res.on('data', (chunk: Buffer) => chunks.push(chunk)).on('end', () => done(null, Buffer.concat(chunks)));
    })
    .expect(200);
  const files = unzipSync(zip.body as Uint8Array);
  const name = Object.keys(files).find((path) => path.includes('deflection') && path.endsWith('.csv'));
  const rows: string[][] = parse(strFromU8(files[name ?? ''] ?? new Uint8Array()), { fromLine: 2 });
  return rows.filter((_, index) => index % 10 === 0).map(([at = '', value = '']) => ({ utcMs: Date.parse(at), rad: Number(value) }));
}

const iso = (utcMs: number) => new Date(utcMs).toISOString();
const commaUrad = (rad: number) => (rad * 1e6).toFixed(3).replace('.', ',');

/** Writes a file with a header and rows made from the night. */
function file(name: string, header: string, row: (sample: { utcMs: number; rad: number }, index: number) => string): string {
  const path = join(folder, name);
  writeFileSync(path, `${[header, ...night.map(row)].join('\n')}\n`);
  return path;
}

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  const chapter = chapters(() => hand);
  const send = (path: string) => hand.at('file-input').setInputFiles(path);
  beforeAll(async () => {
    hand = new Hand(await lab().open(size, 'analyst'));
  });
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  chapter('a file without a table is refused with what is missing', async () => {
    await hand.goes(`/runs/${runId}/data`, 'data-screen');
    await hand.taps('to-import');
    await hand.at('import-screen').waitFor();
    const path = join(folder, 'notes.txt');
    writeFileSync(path, 'deflection\n1.5\n1.6\n');
    await send(path);
    await hand.sees('notes.txt was not taken in');
    await hand.sees(/a row needs at least two columns, a time and a value/);
    await hand.shoots('import-refused');
  });

  chapter('what the file does not tell must be stated before it is read', async () => {
    await send(file('no-unit.csv', 'time,deflection', ({ utcMs, rad }) => `${iso(utcMs)},${(rad * 1e3).toFixed(6)}`));
    await hand.sees('Still to state: the unit of the deflection.');
    expect(await hand.isEnabled('check-import')).toBe(false);
    await hand.chooses('map-unit', 'mrad');
    expect(await hand.isEnabled('check-import')).toBe(true);
  });

  chapter('a wrong column is named with its row, and what was stated stays', async () => {
    await hand.types('channel-name', `Balance ${size}`);
    await hand.chooses('map-value', '0');
    await hand.sees('two different columns for time and deflection');
    await hand.chooses('map-time', '1');
    await hand.taps('check-import');
    await hand.reads('import-check', /2deflectionthe time "-?[\d.]+" is not ISO 8601.*2timethe value "[\dT:.Z-]+" is no number/);
    await hand.sees('more are not listed. Correct these first.');
    await hand.at('import-check').scrollIntoViewIfNeeded();
    await hand.shoots('import-problems');
    await hand.chooses('map-time', '0');
    await hand.chooses('map-value', '1');
    await hand.chooses('map-decimal', ',');
    await hand.taps('check-import');
    await hand.sees('The comma cannot part the columns and be the decimal sign at once.');
    expect(await hand.at('map-unit').inputValue()).toBe('mrad');
    expect(await hand.at('channel-name').inputValue()).toBe(`Balance ${size}`);
    await hand.tapsOn('Another file');
  });

  chapter('two ways of writing the time are found at their row', async () => {
    await send(
      file(
        'mixed.csv',
        'time_utc,deflection_mrad',
        ({ utcMs, rad }, index) => `${index < 3 ? iso(utcMs) : String(utcMs / 1000)},${(rad * 1e3).toFixed(6)}`,
      ),
    );
    if ((await hand.at('map-format').inputValue()) === '') await hand.chooses('map-format', 'iso');
    await hand.taps('check-import');
    await hand.reads('import-check', /5time_utcthe time ".*" is not ISO 8601.*all rows must be written in one way/);
    expect(await hand.page.getByTestId('store-import').count()).toBe(0);
    await hand.tapsOn('Another file');
  });

  chapter('a value that is not a number is found at its row and column', async () => {
    await send(
      file(
        'gap.csv',
        'time_utc,deflection_mrad',
        ({ utcMs, rad }, index) => `${iso(utcMs)},${index === 7 ? 'NaN' : (rad * 1e3).toFixed(6)}`,
      ),
    );
    await hand.taps('check-import');
    await hand.reads(
      'import-check',
      /1 problem in .* rows\. Nothing is stored until there are none\..*9deflection_mradthe value is NaN; leave the whole row out/,
    );
    await hand.tapsOn('Another file');
  });

  chapter('a good file with semicolons and decimal commas is read, looked over and stored', async () => {
    await send(file('night.csv', 'time_utc;temperature_degC;deflection_urad', ({ utcMs, rad }) => `${iso(utcMs)};21,4;${commaUrad(rad)}`));
    await hand.at('mapping-form').waitFor();
    expect(await hand.at('map-delimiter').inputValue()).toBe(';');
    expect(await hand.at('map-decimal').inputValue()).toBe(',');
    expect(await hand.at('map-unit').inputValue()).toBe('urad');
    await hand.reads('import-preview', /temperature_degC.*deflection_urad/);
    // The name typed for the file before is still there.
    expect(await hand.at('channel-name').inputValue()).toBe(`Balance ${size}`);
    await hand.shoots('import-mapping');
    await hand.taps('check-import');
    await hand.reads('import-check', new RegExp(`All ${printed(night.length)} rows can be read.*a sample every 1\\.00 s.*100 %`));
    await hand.at('import-check').scrollIntoViewIfNeeded();
    await hand.shoots('import-checked');
    await hand.taps('store-import');
    await hand.reads('import-stored', new RegExp(`${printed(night.length)} samples stored in Balance ${size}`));
  });

  chapter('it is drawn against the steps, and reads as it was sent', async () => {
    await hand.tapsOn('See it against the steps', 'link');
    await hand.at('channel-plot').waitFor();
    const label = await hand
      .at('channel')
      .locator('option', { hasText: `Balance ${size}` })
      .getAttribute('value');
    expect(await hand.at('channel').inputValue()).toBe(label);
    await hand.reads('channel-plot', new RegExp(`${printed(night.length)} samples`));
    await hand.hears('channel-plot', new RegExp(`Balance ${size} over the run`));
    await hand.page.locator('[data-testid="deflection-plot"] canvas').first().waitFor();
    const exported = await (await hand.context.request.get((await hand.at('export-csv').getAttribute('href')) ?? '')).text();
    await hand.tapsOn('Show a shorter time');
    await hand.shoots('data');
    const { value, utcMs, channel } = await read(lab(), `${runId}/samples?channelId=${label ?? ''}&points=4000`);
    expect(channel).toMatchObject({ unit: 'urad', source: 'import' });
    expect(value).toHaveLength(night.length);
    expect(utcMs).toEqual(night.map((sample) => sample.utcMs));
    expect(Math.max(...night.map(({ rad }, index) => Math.abs(rad * 1e6 - value[index])))).toBeLessThan(6e-4);
    expect(
      exported
        .split('\n')
        .slice(1, -1)
        .map((line) => Number(line.split(',')[1])),
    ).toEqual(value);
  });

  chapter('the same file again adds nothing', async () => {
    await hand.taps('to-import');
    await send(join(folder, 'night.csv'));
    await hand.sees(new RegExp(`Filled in as Tam Ferrowdale read a file with the same columns into Balance \\w+, .*`));
    await hand.types('channel-name', `Balance ${size}`);
    await hand.taps('check-import');
    await hand.taps('store-import');
    await hand.reads('import-stored', new RegExp(`^0 samples stored in Balance ${size}; ${printed(night.length)} were there already`));
  });

  chapter('a file that differs is compared before anything is stored, and what counts is chosen', async () => {
    await hand.tapsOn('Import another file');
    const path = join(folder, 'differs.csv');
    const rows = night
      .map(({ utcMs, rad }, index) => `${iso(utcMs)};21,4;${index === 5 ? '1,5' : commaUrad(rad)}`)
      .filter((_, index) => index < 20 || index > 60);
    writeFileSync(path, `time_utc;temperature_degC;deflection_urad\n${rows.join('\n')}\n`);
    await send(path);
    await hand.types('channel-name', `Balance ${size}`);
    await hand.taps('check-import');
    await hand.reads('import-findings', /1 row of the file has another value than Balance \w+ holds at the same instant/);
    await hand.reads('import-findings', /The file has a gap, 42 s\. Gaps stay gaps: nothing is filled in\..*41 samples/);
    await hand.reads('import-undecided', 'which value counts at the same instant');
    expect(await hand.page.getByTestId('store-import').count()).toBe(0);
    await hand.at('import-findings').scrollIntoViewIfNeeded();
    await hand.shoots('import-findings');
    await hand.chooses('same-instant', 'keep');
    await hand.taps('store-import');
    await hand.reads('import-stored', /^0 samples stored in .*, 1 with another value, which was kept\./);
  });

  chapter('a second record of the same time is shown by stretch, and left out where that is chosen', async () => {
    await hand.tapsOn('Import another file');
    await send(
      file('beside.csv', 'time_utc;temperature_degC;deflection_urad', ({ utcMs, rad }) => `${iso(utcMs + 400)};21,4;${commaUrad(rad)}`),
    );
    await hand.types('channel-name', `Balance ${size}`);
    await hand.taps('check-import');
    await hand.reads('import-findings', /rows fall among samples that Balance \w+ holds at other instants: two records of the same time/);
    await hand.chooses('rows-among', 'leave-out');
    await hand.taps('store-import');
    await hand.reads('import-stored', /^1 samples stored in .*; \d[\d ]* rows were left out\./);
  });
});

/** A count as pages print it: groups of three from five digits on, or from four. */
const printed = (count: number) => String(count).replace(/\B(?=(\d{3})+$)/g, ' ?');
