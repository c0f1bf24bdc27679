import { buildArchive } from '@/shared/archive/build-archive';
import { readArchive } from '@/shared/archive/read-archive';
import { evaluateArchive } from '@/shared/evaluation/evaluate-archive';
import { rehearse } from '../engine/rehearsal/rehearse';
import { zipArchive } from '../evaluation/archive-files';
import { measurementReport } from '../evaluation/report';
import { sha256Hex } from '../evaluation/sha256';
import type { HeavyTasks } from '../interfaces/heavy-tasks';
import { rehearsalParts } from './rehearsal-parts';

/** Monte Carlo trials of an evaluation. */
const trials = 100_000;

/** The heavy work itself, done in the calling thread: what a worker thread runs, and what tests call. */
export const heavyTasks: HeavyTasks = {
  rehearse: async (input) => {
    const { outcome, facts, steps, events, channels, startedAtUtcMs, endedAtUtcMs } = await rehearse(input, rehearsalParts());
    return { outcome, reason: outcome === 'finished' ? '' : facts.reason, steps, events, channels, startedAtUtcMs, endedAtUtcMs };
  },
  zipArchive: async (input) => zipArchive(buildArchive(input, sha256Hex)),
  report: (input) => measurementReport(input),
  evaluate: async (input, { channel, clock }) => {
    const archive = readArchive(buildArchive(input, sha256Hex), sha256Hex);
    const chosen = { ...(channel === null ? {} : { channel }), ...(clock === null ? {} : { clock }) };
    const { result, curves, basis } = evaluateArchive(archive, { trials, besides: true, ...chosen });
    return { result, curves, basis };
  },
};
