import { readCsv } from '@/server/ingest/csv-read';
import { FileTooLarge, FileWatch } from '@/server/ingest/receive-file';
import type { ImportMapping } from '@/shared/contracts/data';
import { fileKinds } from './import/try-file';
import { isWhole } from './report';
import { soakSeeds } from './seeded/soak-seeds';

/**
 * CSV files of every kind from seeds: quotes, marks, ends of lines, numbers that are none, other decimal signs; and exports that are taken in again to the last bit. At the
 * end ten million rows in flat memory, and a stream without an end, which is refused at the limit.
 */
const ROWS = 10_000_000;
const ROWS_A_PIECE = 1_000;
const MOST_MIB = 300;
const LIMIT_BYTES = 64 * 2 ** 20;
const PIECE_BYTES = 2 ** 16;
const startUtcMs = Date.UTC(2026, 0, 1);
const mapping: ImportMapping = {
  ...({ delimiter: ',', decimal: '.', headerRow: true } as const),
  ...({ timeColumn: 0, timeFormat: 'iso', valueColumn: 1, unit: 'rad' } as const),
};
const rssMiB = () => process.memoryUsage().rss / 2 ** 20;

async function* longFile(): AsyncGenerator<Uint8Array> {
  yield Buffer.from('time,deflection\n');
  for (let from = 0; from < ROWS; from += ROWS_A_PIECE) {
    const row = (_: unknown, k: number) => `${new Date(startUtcMs + (from + k) * 100).toISOString()},${Math.sin((from + k) / 700)}\n`;
    yield Buffer.from(Array.from({ length: ROWS_A_PIECE }, row).join(''));
  }
}

/** A great file: what was wrong, and the most memory that the process held meanwhile. */
async function greatFile(): Promise<{ greatestMiB: number; violations: string[] }> {
  let [taken, greatestMiB] = [0, 0];
  const reading = await readCsv(longFile(), {
    mapping,
    limits: { nowUtcMs: startUtcMs + ROWS * 100 },
    take: async ({ utcMs }) => {
      taken += utcMs.length;
      greatestMiB = Math.max(greatestMiB, rssMiB());
    },
  });
  const violations = [
    ...(taken === ROWS && reading.problemCount === 0 ? [] : [`of ${ROWS} rows ${taken} were taken, with ${reading.problemCount} problems`]),
    ...(greatestMiB <= MOST_MIB ? [] : [`the process held ${greatestMiB.toFixed(0)} MiB over ${ROWS} rows`]),
  ];
  return { greatestMiB, violations };
}

/** A stream that never ends. */
async function endless(): Promise<{ readBytes: number; violations: string[] }> {
  const counted = { bytes: 0 };
  async function* stream(): AsyncGenerator<Uint8Array> {
    for (; counted.bytes <= 2 * LIMIT_BYTES; counted.bytes += PIECE_BYTES) yield new Uint8Array(PIECE_BYTES).fill(0x31);
  }
  const refused = await (async () => {
    for await (const chunk of new FileWatch(LIMIT_BYTES).watch(stream())) void chunk;
    return null;
  })().catch((error: unknown) => error);
  const isRefused = refused instanceof FileTooLarge && counted.bytes <= LIMIT_BYTES + PIECE_BYTES;
  return {
    readBytes: counted.bytes,
    violations: isRefused ? [] : [`a stream without an end was read for ${counted.bytes} bytes: ${String(refused)}`],
  };
}

soakSeeds('r10', fileKinds, async () => {
  if (!isWhole(process.argv.slice(2))) return { violations: [] };
  const [tooLarge, great] = [await endless(), await greatFile()];
  return {
    ...{ rows: ROWS, greatestMiB: Math.round(great.greatestMiB), refusedAfterBytes: tooLarge.readBytes },
    violations: [...tooLarge.violations, ...great.violations],
  };
});
