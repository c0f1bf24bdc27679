import { createHash } from 'node:crypto';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { demoIds } from '@/db/demo/seed';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';
import { Network } from './support/network';
import { finishedNight } from './support/night';

/** Story 7 on a bad network: a large file comes in parts, goes on where it was cut off, and is kept as it was sent. */

jest.setTimeout(120_000);
const lab = labOfThisFile();
let runId: string;
let startUtcMs: number;
let folder: string;

beforeAll(async () => {
  runId = await finishedNight(lab(), 1);
  startUtcMs = Date.parse((await lab().server.view(runId)).startedAt ?? '');
  folder = mkdtempSync(join(tmpdir(), 'evenfall-uploads-'));
}, 120_000);
afterAll(() => rmSync(folder, { recursive: true, force: true }));

/** Rows of the night and remarks behind them, as many MiB as are wanted. */
function large(name: string, mib: number): string {
  const path = join(folder, name);
  const rows = Array.from(
    { length: 300 },
    (_, row) => `${new Date(startUtcMs + 2000 * row).toISOString()},${(100 * Math.sin(row / 40)).toFixed(3)}`,
  );
  const head = `time_utc,deflection_urad\n${rows.join('\n')}\n`;
  const remark = `# ${name} ${'.'.repeat(70)}\n`;
  writeFileSync(path, `${head}${remark.repeat(Math.ceil((mib * 1_048_576 - head.length) / remark.length))}`.slice(0, mib * 1_048_576));
  return path;
}

interface Listed {
  id: string;
  fileName: string;
  state: string;
  bytes: number;
}

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  let network: Network;
  /** Where the parts began that the page sent. */
  let offsets: number[] = [];
  /** At the part that begins there the network goes down. */
  let cutsAt = Infinity;
  const chapter = chapters(() => hand);
  const send = (path: string) => hand.at('file-input').setInputFiles(path);
  const listed = async (fileName: string): Promise<Listed | undefined> => {
    const { body } = await lab().server.as('viewer', 'GET', `/labs/${demoIds.lab}/runs/${runId}/imports`).expect(200);
    return (body.items as Listed[]).find((one) => one.fileName === fileName);
  };
  beforeAll(async () => {
    network = await Network.to(lab().address);
    hand = new Hand(await lab().open(size, 'analyst', { address: network.address }));
    hand.page.on('request', (request) => {
      const offset = /\/content\?offset=(\d+)/.exec(request.url())?.[1];
      if (offset === undefined) return;
      offsets.push(Number(offset));
      if (Number(offset) >= cutsAt) network.become('cut');
    });
  });
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
    await network.close();
  });

  chapter('a file larger than the server takes is refused before it is sent', async () => {
    await hand.goes(`/runs/${runId}/import`, 'import-screen');
    await send(large(`years-${size}.csv`, 5));
    await hand.sees(`years-${size}.csv was not taken in`);
    await hand.sees(`years-${size}.csv is larger than 4 MiB. Cut it into parts, or leave out columns that are not needed.`);
    expect(offsets).toEqual([]);
  });

  const night = `night-${size}.csv`;
  chapter('the network goes down in its midst: the page says so, and goes on by itself where the server stopped', async () => {
    cutsAt = 1_048_576;
    await send(large(night, 3.5));
    await hand.reads('upload-waiting', 'The network is away. What has come is kept; it goes on by itself.');
    await hand.reads('upload-sent', /^1\.0 of 3\.5 MiB have come$/);
    await hand.shoots('upload-cut');
    const before = await listed(night);
    expect(before?.state).toBe('waiting');
    expect(before?.bytes).toBeGreaterThanOrEqual(1_048_576);
    offsets = [];
    cutsAt = Infinity;
    network.become('open');
    await hand.at('import-preview').waitFor();
    // Nothing that had come is sent again; parts that were under way when the line was cut may have come after all.
    expect(Math.min(...offsets)).toBeGreaterThanOrEqual(before?.bytes ?? Infinity);
    expect((await listed(night))?.state).toBe('received');
  });

  chapter('it is stored, and given back byte for byte with its SHA-256', async () => {
    await hand.types('channel-name', `Large ${size}`);
    await hand.taps('check-import');
    await hand.taps('store-import');
    await hand.reads('import-stored', `300 samples stored in Large ${size}`);
    await hand.tapsOn('See it against the steps', 'link');
    const sent = readFileSync(join(folder, night));
    await hand.reads('kept-files', new RegExp(`${night}.*3\\.5 MiB into Large ${size}, by Tam Ferrowdale`));
    await hand.reads('kept-files', createHash('sha256').update(sent).digest('hex'));
    const href = (await hand.page.getByTestId('kept-files').getByTestId('original').first().getAttribute('href')) ?? '';
    expect(Buffer.from(await (await hand.context.request.get(href)).body()).equals(sent)).toBe(true);
    await hand.at('kept-files').scrollIntoViewIfNeeded();
    await hand.shoots('kept-files');
  });

  const left = `left-${size}.csv`;
  chapter('a page that was left meanwhile: the same file chosen again goes on', async () => {
    await hand.taps('to-import');
    cutsAt = 1_048_576;
    await send(large(left, 3.5));
    await hand.at('upload-waiting').waitFor();
    await hand.looksAway();
    cutsAt = Infinity;
    network.become('open');
    await hand.goes(`/runs/${runId}/import`, 'import-screen');
    const had = (await listed(left))?.bytes ?? 0;
    await hand.reads('unfinished', new RegExp(`${left}.*of 3\\.5 MiB, begun by Tam Ferrowdale`));
    await hand.shoots('upload-unfinished');
    offsets = [];
    await send(join(folder, left));
    await hand.at('import-preview').waitFor();
    expect(offsets[0]).toBe(had);
    // It was read before under other words: how the same columns were read is offered, and can be left.
    await hand.sees(`Filled in as Tam Ferrowdale read a file with the same columns into Large ${size}`);
    await hand.shoots('import-remembered');
    await hand.taps('guess-mapping');
    await hand.sees('Guessed from the file.');
  });

  chapter('whoever cancels throws away what has come', async () => {
    await hand.tapsOn('Another file');
    const name = `cancelled-${size}.csv`;
    cutsAt = 1_048_576;
    await send(large(name, 3.5));
    await hand.at('upload-waiting').waitFor();
    cutsAt = Infinity;
    network.become('open');
    await hand.taps('cancel-upload');
    await hand.at('choose-file').waitFor();
    await until(async () => (await listed(name)) === undefined, 'the file to be gone');
    // One that stayed behind is thrown away by whoever comes next.
    cutsAt = 1_048_576;
    await send(join(folder, name));
    await hand.at('upload-waiting').waitFor();
    await hand.taps('cancel-upload');
    await hand.at('choose-file').waitFor();
    cutsAt = Infinity;
    network.become('open');
    await hand.goes(`/runs/${runId}/import`, 'import-screen');
    await hand.reads('unfinished', name);
    await hand.tapsOn(`Throw ${name} away`);
    await until(async () => (await listed(name)) === undefined, 'the rest to be gone');
  });
});
