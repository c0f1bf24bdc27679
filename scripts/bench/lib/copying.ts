import { Readable } from 'node:stream';
import { pipeline } from 'node:stream/promises';
import { from as copyFrom } from 'pg-copy-streams';
import { connect } from '@/db/connect';
import { demoIds } from '@/db/demo/seed';
import { encodeSamples } from '@/server/store/sample-copy';

/** A process that copies a million samples into a table with the key of the samples, again and again until its parent lets go. */

const rows = 1_000_000;
const startUtcMs = Date.UTC(2026, 0, 1);

async function run(url: string): Promise<void> {
  let ending = false;
  process.on('disconnect', () => {
    ending = true;
  });
  const connection = connect({ url, maxConnections: 1 });
  await connection.pool.query('create table copied (like samples including all)');
  const batch = { utcMs: new Float64Array(rows).map((_, index) => startUtcMs + index * 100), value: new Float64Array(rows) };
  process.send?.('copying');
  while (!ending) {
    await connection.bulk((client) =>
      pipeline(
        Readable.from(encodeSamples(batch, [demoIds.lab, demoIds.channel])),
        client.query(copyFrom('copy copied (lab_id, channel_id, at, value) from stdin (format binary)')),
      ),
    );
    await connection.pool.query('truncate copied');
  }
  await connection.close();
}

void run(process.argv[2] as string);
