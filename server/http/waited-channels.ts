import { scaleOf } from '@/shared/evaluation/channel-scale';
import { formatDuration } from '@/shared/lib/format-duration';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { walkSteps } from '@/shared/protocol/step-path';
import { waitOf } from '@/shared/protocol/wait';
import type { RigDocument } from '@/shared/rig/document';
import type { ChannelRecord } from '../store/imports';
import { fail, note, pass, type Outcome } from './start-check-parts';

/** Whether the channels that steps wait for are there, flow and can be read: a step that waits in vain must be told before the night, not in it. */

/** A channel that has been silent for longer does not flow, ms; of a slow one, so many intervals. */
const FRESH_MS = 60_000;
const FRESH_INTERVALS = 5;

interface WaitedFor {
  /** Of the first step that waits for it. */
  path: string;
  /** Null: the deflection. */
  channel: string | null;
  atMostS: number;
  otherwise: 'hold' | 'continue' | 'stop';
}

/** What the steps of a protocol wait for, each channel once. */
export function waitedFor(protocol: ProtocolDocument): WaitedFor[] {
  const found = new Map<string | null, WaitedFor>();
  for (const { step, path } of walkSteps(protocol.steps)) {
    const wait = waitOf(step);
    if (wait === null) continue;
    const { channel, atMostS, otherwise } = wait;
    const known = found.get(channel);
    // A step that goes on without it is the milder one.
    if (known === undefined || (known.otherwise === 'continue' && otherwise !== 'continue'))
      found.set(channel, { path, channel, atMostS, otherwise });
  }
  return [...found.values()];
}

export type RigChannel = Pick<ChannelRecord, 'name' | 'unit' | 'role' | 'rateHz'> & {
  /** Of its last sample; null: none ever came. */
  lastUtcMs: number | null;
};

export interface Waiting {
  wanted: readonly WaitedFor[];
  /** Those of the rig that fill by themselves. */
  channels: readonly RigChannel[];
  /** Channel with the deflection; null: none fills by itself. */
  deflection: string | null;
  document: RigDocument;
  nowUtcMs: number;
}

/** The check in words; null where no step waits for a channel. Pure. */
export function judgeWaitedChannels({ wanted, ...seen }: Waiting): Outcome | null {
  if (wanted.length === 0) return null;
  const lacking = wanted.flatMap((each) => {
    const why = whyInVain(each, seen);
    return why === null ? [] : [{ ...each, why }];
  });
  const names = wanted.map(({ channel }) => channel ?? seen.deflection ?? 'deflection').join(', ');
  if (lacking.length === 0) return pass(`All that steps wait for is being filled: ${names}.`);
  const then = { hold: 'then the run would hold', continue: 'then the run would go on without it', stop: 'then the run would stop' };
  const words = lacking.map(
    ({ path, why, atMostS, otherwise }) => `${path} would wait in vain for ${formatDuration(atMostS)}, ${then[otherwise]}: ${why}`,
  );
  return (lacking.every(({ otherwise }) => otherwise === 'continue') ? note : fail)(words.join(' '));
}

function whyInVain({ channel }: WaitedFor, { channels, deflection, document, nowUtcMs }: Omit<Waiting, 'wanted'>): string | null {
  const name = channel ?? deflection;
  if (name === null) return 'no deflection arrives by itself on this rig. Let a device send it, or settle for a fixed time.';
  const found = channels.find((each) => each.name === name);
  if (found === undefined) {
    const there = channels.map((each) => each.name).join(', ');
    return `no device of this rig fills a channel "${name}". ${there === '' ? 'There is none yet.' : `There are: ${there}.`}`;
  }
  if (found.lastUtcMs === null) return `the channel ${name} has no sample yet.`;
  const silentMs = nowUtcMs - found.lastUtcMs;
  if (silentMs > Math.max(FRESH_MS, found.rateHz === null ? 0 : (1000 * FRESH_INTERVALS) / found.rateHz))
    return `the channel ${name} has had no sample for ${formatDuration(silentMs / 1000)}.`;
  return channel === null ? whyUnreadable(found, document) : null;
}

/** Only an angle tells how far the pendulum swings. */
function whyUnreadable({ name, unit }: RigChannel, document: RigDocument): string | null {
  try {
    scaleOf({ name, unit, quantity: '', role: 'deflection' }, document);
    return null;
  } catch (error) {
    return `${error instanceof Error ? error.message : String(error)}.`;
  }
}
