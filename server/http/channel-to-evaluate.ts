import type { ChannelRecord } from '../store/imports';
import { channelsOfRun, type RunRecord } from '../store/runs-read';
import { countSamples } from '../store/sample-summaries';
import { ProblemError } from './problem-error';
import { windowOf } from './run-window';
import type { Services } from './services';

/** Deflection channels with samples within a run, with their number. */
export async function filledDeflection(services: Services, run: RunRecord): Promise<(ChannelRecord & { samples: number })[]> {
  const window = windowOf(run, services);
  const filled: (ChannelRecord & { samples: number })[] = [];
  for (const channel of await channelsOfRun(services.database.db, run)) {
    if (channel.role !== 'deflection') continue;
    const samples = await countSamples(services.database, { ...window, labId: run.labId, channelId: channel.id });
    if (samples > 0) filled.push({ ...channel, samples });
  }
  return filled;
}

/** Name of the channel to evaluate: the one asked for, the registered one, or the only deflection channel with data. */
export async function channelToEvaluate(services: Services, run: RunRecord, asked: string | undefined): Promise<string> {
  const filled = (await filledDeflection(services, run)).map(({ name }) => name);
  const wanted = asked ?? run.start.protocol.evaluation?.channel;
  if (wanted !== undefined) {
    if (filled.includes(wanted)) return wanted;
    const there = filled.length === 0 ? 'no deflection channel has any' : `these have: ${filled.join(', ')}`;
    throw new ProblemError('cannot-evaluate', `The channel "${wanted}" has no deflection within this run; ${there}.`, [
      { path: 'channel', message: 'a deflection channel with data' },
    ]);
  }
  const [only, second] = filled;
  if (only === undefined)
    throw new ProblemError('cannot-evaluate', 'No deflection lies within this run. Bring the file of the readout in first.');
  if (second !== undefined)
    throw new ProblemError('cannot-evaluate', `More than one channel has deflection within this run: ${filled.join(', ')}. Choose one.`, [
      { path: 'channel', message: `one of ${filled.join(', ')}` },
    ]);
  return only;
}
