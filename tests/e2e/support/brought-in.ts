import { demoIds } from '@/db/demo/seed';
import type { Hand } from './hand';
import type { Lab } from './lab';

/** A deflection file of a night with a gap. */
const fileOf = (nightUtcMs: number, angle: (row: number) => number) =>
  `time_utc,deflection_urad\n${Array.from({ length: 200 }, (_, row) => row)
    .filter((row) => row < 50 || row > 80)
    .map((row) => `${new Date(nightUtcMs + 2000 * row).toISOString()},${String(angle(row))}`)
    .join('\n')}\n`;

/** Stores a file of a run in the channel Readout, and begins another that does not come. Returns when the run began, UTC ms. */
export async function bringsIn(lab: Lab, runId: string): Promise<number> {
  const nightUtcMs = Date.parse((await lab.server.view(runId)).startedAt ?? '');
  const ask = (method: string, path: string) => lab.server.as('analyst', method, `/labs/${demoIds.lab}${path}`);
  const mapping = { delimiter: ',', decimal: '.', headerRow: true, timeColumn: 0, timeFormat: 'iso', valueColumn: 1, unit: 'urad' };
  const { body } = await ask('POST', `/runs/${runId}/imports`).send({ fileName: 'night.csv' }).expect(201);
  const text = fileOf(nightUtcMs, (row) => row / 10);
  await ask('PUT', `/imports/${String(body.id)}/content`)
    .set('Content-Type', 'text/csv')
    .send(text)
    .expect(200);
  await ask('POST', `/imports/${String(body.id)}/commit`)
    .send({ mapping, channelName: 'Readout' })
    .expect(200);
  await ask('POST', `/runs/${runId}/imports`).send({ fileName: 'another.csv', bytes: 3_000_000 }).expect(201);
  return nightUtcMs;
}

/** Sends the same night with other values, some out of reach, some between the stored ones, and checks it against the channel that holds them. */
export async function checksAnother(hand: Hand, nightUtcMs: number): Promise<void> {
  const text = fileOf(nightUtcMs, (row) => (row === 7 || row === 9 ? 90_000 : row / 9))
    .split('\n')
    .map((row, index) =>
      index > 150 ? row.replace(/(\d)(\d\d)Z,/, (_, tenths: string, rest: string) => `${String((Number(tenths) + 4) % 10)}${rest}Z,`) : row,
    )
    .join('\n');
  await hand.at('file-input').setInputFiles({ name: 'again.csv', mimeType: 'text/csv', buffer: Buffer.from(text) });
  await hand.types('channel-name', 'Readout');
  await hand.taps('check-import');
  await hand.at('import-findings').scrollIntoViewIfNeeded();
}

/** Sends a file that the server does not take for the moment, so that it stays under way. */
export async function sendsInVain(hand: Hand): Promise<void> {
  await hand.page.route('**/api/labs/*/imports/*/content*', (route) => route.abort());
  const buffer = Buffer.from(fileOf(Date.UTC(2031, 1, 14), (row) => row / 8));
  await hand.at('file-input').setInputFiles({ name: 'under-way.csv', mimeType: 'text/csv', buffer });
  await hand.at('upload-waiting').waitFor();
}
