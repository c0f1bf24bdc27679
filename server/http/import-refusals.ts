import type { ImportMapping } from '@/shared/contracts/data';
import { FrozenSamplesError, RowsAmongSamplesError, StoredMeanwhileError } from '@/server/store/import-commit';
import { ConflictingSamplesError, UnsuitableChannelError, type ChannelRecord, type WantedChannel } from '@/server/store/imports';
import type { RunRecord } from '@/server/store/runs-read';
import { ThinnedSamplesError } from '@/server/store/thinned-error';
import { isoOf } from './maker';
import { ProblemError } from './problem-error';
import type { Services } from './services';

interface Asked {
  channelName: string;
  mapping: ImportMapping;
}

/** The channel that a file of a run goes into. */
export function wantedChannel(run: RunRecord, { channelName, mapping }: Asked, { clock }: Pick<Services, 'clock'>): WantedChannel {
  return {
    labId: run.labId,
    rigId: run.rigId,
    runId: run.rehearsal ? run.id : null,
    name: channelName,
    unit: mapping.unit,
    quantity: mapping.unit.endsWith('rad') ? 'pendulum angle' : 'spot position',
    role: 'deflection',
    source: 'import',
    createdAt: clock.utcMs(),
  };
}

/** What a failure of the store says to whoever brings a file in; any other failure as it is. */
export function refusalOf(error: unknown, { channelName, mapping }: Asked): unknown {
  if (error instanceof UnsuitableChannelError) return channelRefusal(error.channel, mapping.unit);
  if (error instanceof StoredMeanwhileError) return new ProblemError('not-possible-now', 'The file is stored already.');
  if (error instanceof FrozenSamplesError)
    return new ProblemError(
      'already-exists',
      `Nothing was stored: at ${isoOf(error.atUtcMs)} the file has another value than ${channelName}, and a frozen evaluation stands on that night. Keep what is stored, or choose another channel name.`,
      [{ path: 'choices.sameInstant', message: 'keep what is stored' }],
    );
  if (error instanceof RowsAmongSamplesError)
    return new ProblemError(
      'already-exists',
      `Nothing was stored: ${String(error.rows)} rows fall among samples that ${channelName} holds at other instants, first from ${isoOf(error.stretch.fromUtcMs)} to ${isoOf(error.stretch.toUtcMs)}. Choose another channel name, or say whether such rows are stored beside them or left out.`,
      [{ path: 'choices.among', message: 'both, or leave out' }],
    );
  if (error instanceof ThinnedSamplesError)
    return new ProblemError(
      'already-exists',
      `Nothing was stored: rows of the file lie where ${channelName} was thinned to its summaries, from ${isoOf(error.fromUtcMs)} to ${isoOf(error.toUtcMs)}. Choose another channel name, or leave out the rows from outside the run.`,
      [{ path: 'choices.outsideRun', message: 'leave out' }],
    );
  if (error instanceof ConflictingSamplesError)
    return new ProblemError(
      'already-exists',
      `Nothing was stored: the channel ${channelName} holds another value at ${isoOf(error.atUtcMs)} already. Choose another channel name, or say which of both counts.`,
      [{ path: 'choices.sameInstant', message: 'keep what is stored, or replace it' }],
    );
  return error;
}

/** Why a file cannot go into the channel that was named. */
function channelRefusal(channel: ChannelRecord, unit: string): ProblemError {
  const item = [{ path: 'channelName', message: `a name other than ${channel.name}` }];
  if (channel.source !== 'import')
    return new ProblemError(
      'already-exists',
      `The channel ${channel.name} is filled by the rig itself. Choose another name for the imported one.`,
      item,
    );
  return new ProblemError(
    'already-exists',
    `The channel ${channel.name} is in ${channel.unit}, the file in ${unit}. Choose another name, or the unit ${channel.unit}.`,
    item,
  );
}
