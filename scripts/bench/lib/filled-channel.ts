import { demoIds } from '@/db/demo/seed';
import { findOrMakeChannel } from '@/server/store/imports';
import { createSampleStore } from '@/server/store/sample-store';
import type { BenchDatabase } from './fresh-database';

/** A channel of the demo rig at 10 Hz with as many samples as are wanted. */

export const startUtcMs = Date.UTC(2026, 0, 1);
export const intervalMs = 100;
const aBatch = 100_000;
const { lab: labId, rig: rigId } = demoIds;

const valueOf = (index: number) => 2e-3 * Math.sin(index / 700) + 1e-7 * ((index * 7919) % 1000);

export async function fill({ connection }: BenchDatabase, size: number): Promise<string> {
  const facts = { quantity: 'pendulum angle', unit: 'rad', role: 'deflection' as const, source: 'stream' as const, createdAt: startUtcMs };
  const { id } = await findOrMakeChannel(connection.db, { ...facts, labId, rigId, runId: null, name: `of ${String(size)}` });
  const store = createSampleStore(connection);
  for (let from = 0; from < size; from += aBatch) {
    const numbers = Float64Array.from({ length: Math.min(aBatch, size - from) }, (_, index) => from + index);
    await store.append(labId, id, { utcMs: numbers.map((number) => startUtcMs + number * intervalMs), value: numbers.map(valueOf) });
  }
  await connection.pool.query('vacuum analyze sample_summaries');
  await connection.pool.query('vacuum analyze samples');
  return id;
}
