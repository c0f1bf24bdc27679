import { judgeDwell, type DwellFacts, type DwellLook } from '@/shared/conditions/dwell-verdict';
import { lookAtWait, type WaitFinding } from '@/shared/conditions/wait-condition';
import type { RunStart } from '@/shared/archive/run-records';
import type { Step } from '@/shared/protocol/document';
import { waitOf } from '@/shared/protocol/wait';
import { type Clock, HOST_STEP_MS, type Instant, wallUtcMs } from '../interfaces/clock';
import type { SampleReader } from '../interfaces/sample-reader';
import type { RunEvent } from './run-context';

/** What the chart asks to be looked up in the samples; the driver answers with `looked`. */
export type Look =
  | ({ kind: 'dwell' } & Pick<DwellLook, 'seq' | 'fromUtcMs' | 'toUtcMs' | 'angleDeg' | 'swungFromDeg' | 'before'>)
  | { kind: 'wait'; seq: number; step: Step; fromUtcMs: number; angleDeg: number };

export type Finding =
  | { kind: 'dwell'; facts: DwellFacts }
  /** `unsimulated`: a rehearsal has no such channel, and the condition counts as met. */
  | { kind: 'wait'; seq: number; found: WaitFinding; unsimulated: boolean };

/** Samples are stamped by wall clocks: where that of the server was set, the run sees them in the time that it keeps to. */
function inTimeOf(clock: Clock, reader: SampleReader): SampleReader {
  const aheadMs = wallUtcMs(clock) - clock.utcMs();
  if (Math.abs(aheadMs) < HOST_STEP_MS) return reader;
  return {
    deflection: (wanted) => reader.deflection(wanted),
    read: (channel, { fromUtcMs, toUtcMs }) => {
      const series = reader.read(channel, { fromUtcMs: fromUtcMs + aheadMs, toUtcMs: toUtcMs + aheadMs });
      return series === null ? null : { ...series, utcMs: series.utcMs.map((utcMs) => utcMs - aheadMs) };
    },
  };
}

/** Answers a look from the samples that are there at `nowUtcMs`; null where a dwell cannot be judged because no deflection ever came. */
function lookUp(start: RunStart, look: Look, { reader, nowUtcMs }: { reader: SampleReader; nowUtcMs: number }): Finding | null {
  const deflection = reader.deflection(start.protocol.evaluation?.channel);
  return look.kind === 'dwell'
    ? dwellFinding(start, look, { reader, nowUtcMs, deflection })
    : waitFinding(start, look, { reader, nowUtcMs, deflection });
}

interface Eyes {
  reader: SampleReader;
  nowUtcMs: number;
  /** Name of the channel with the deflection. */
  deflection: string | null;
}

function dwellFinding(start: RunStart, look: Look & { kind: 'dwell' }, { reader, nowUtcMs, deflection }: Eyes): Finding | null {
  const { rig, protocol, simulated } = start;
  const { fromUtcMs, toUtcMs } = look;
  const window = { fromUtcMs, toUtcMs };
  const series = deflection === null ? null : reader.read(deflection, window);
  if (series === null && protocol.goodWhen?.channels === undefined) return null;
  const facts = judgeDwell({
    ...look,
    ...{ rig, goodWhen: protocol.goodWhen, nowUtcMs, deflection: series },
    channel: (name) => reader.read(name, window),
    simulated: simulated !== null,
  });
  return { kind: 'dwell', facts };
}

function waitFinding(start: RunStart, look: Look & { kind: 'wait' }, { reader, nowUtcMs, deflection }: Eyes): Finding {
  const { step, seq, fromUtcMs, angleDeg } = look;
  const wait = waitOf(step);
  const channel = wait?.channel ?? deflection;
  const windowMs = 1000 * (wait?.windowS ?? 0);
  const series = channel === null ? null : reader.read(channel, { fromUtcMs: Math.max(fromUtcMs, nowUtcMs - windowMs), toUtcMs: nowUtcMs });
  const unsimulated = series === null && start.simulated !== null;
  const found = lookAtWait(step, { rig: start.rig, angleDeg, sinceUtcMs: fromUtcMs, nowUtcMs, series });
  return { kind: 'wait', seq, found: unsimulated ? { ...found, met: true } : found, unsimulated };
}

interface Seer {
  start: RunStart;
  clock: Clock;
  samples?: SampleReader;
}

/** The event that answers a look. */
export function lookedInto({ start, clock, samples }: Seer, look: Look, at: Instant): RunEvent {
  const finding = samples === undefined ? null : lookUp(start, look, { reader: inTimeOf(clock, samples), nowUtcMs: at.utcMs });
  return { type: 'looked', at, finding };
}
