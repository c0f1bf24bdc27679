import type { ChainedEvent } from '@/shared/archive/run-records';
import type { LiveMessages, RunView, StepRowView } from '@/shared/contracts/runs';
import { isOver } from './run-words';

/** What the page knows of a running run, as a pure function of what arrived and when. */

type Beat = LiveMessages['beat'];

export interface LiveChannel {
  id: string;
  name: string;
  unit: string;
}

export interface LiveState {
  view: RunView | null;
  /** Rows of the step log in order. */
  rows: readonly StepRowView[];
  /** The newest events, oldest first. */
  events: readonly ChainedEvent[];
  channel: LiveChannel | null;
  /** Samples received live, oldest first; thinned where there are many. */
  utcMs: readonly number[];
  value: readonly number[];
  beat: Beat | null;
  /** Device time of the newest beat or message, ms; null before the first. */
  heardAtMs: number | null;
  /** The run's time minus the device's by the newest beats, ms: a beat that took longer shows a smaller difference, so the greatest counts. */
  offsets: readonly number[];
  stream: 'opening' | 'open' | 'broken';
  /** Highest sequence number of the chain seen so far. */
  seenSeq: number;
  /** Something was missed: the page has to ask for the whole again. */
  missed: boolean;
}

export type LiveAction =
  | { kind: 'opened' }
  | { kind: 'broken' }
  | { kind: 'messages'; messages: readonly LiveMessage[] }
  | { kind: 'loaded'; view: RunView; rows: readonly StepRowView[] };

export type LiveMessage = { [K in keyof LiveMessages]: { type: K; data: LiveMessages[K]; receivedAtMs: number } }[keyof LiveMessages];

const keptOffsets = 30;
const keptEvents = 200;
const keptSamples = 12_000;

export const noLive: LiveState = {
  view: null,
  rows: [],
  events: [],
  channel: null,
  utcMs: [],
  value: [],
  beat: null,
  heardAtMs: null,
  offsets: [],
  stream: 'opening',
  seenSeq: 0,
  missed: false,
};

/** The next state. Repeated and overtaken messages change nothing. */
export function liveReducer(state: LiveState, action: LiveAction): LiveState {
  switch (action.kind) {
    case 'opened':
      return { ...state, stream: 'open' };
    case 'broken':
      return { ...state, stream: 'broken' };
    case 'loaded':
      return { ...withView(state, action.view), rows: mergeRows(state.rows, action.rows), missed: state.seenSeq > action.view.lastSeq };
    case 'messages':
      return action.messages.reduce(receive, state);
  }
}

function receive(before: LiveState, message: LiveMessage): LiveState {
  const state = { ...before, heardAtMs: message.receivedAtMs, stream: 'open' as const };
  switch (message.type) {
    case 'snapshot':
      return withCurrent(withView(state, message.data), message.data.current);
    case 'progress':
      // Every stream begins with a snapshot, so there is a view by now.
      return state.view === null ? state : withCurrent(withView(state, { ...state.view, ...message.data }), message.data.current);
    case 'event':
      return withEvent(state, message.data);
    case 'step':
      return { ...state, rows: mergeRows(state.rows, [message.data]) };
    case 'samples':
      return withSamples(state, message.data);
    case 'beat': {
      // Deadlines and rows are in the time that the run keeps to.
      const offset = Date.parse(message.data.serverAt) + (message.data.runAheadMs ?? 0) - message.receivedAtMs;
      return { ...state, beat: message.data, offsets: [...state.offsets, offset].slice(-keptOffsets) };
    }
  }
}

const withCurrent = (state: LiveState, current: StepRowView | null): LiveState =>
  current === null ? state : { ...state, rows: mergeRows(state.rows, [current]) };

/** A view that is older than what was seen is kept out: a slow answer must not turn the screen back. */
function withView(state: LiveState, view: RunView): LiveState {
  if (state.view !== null && view.lastSeq < state.view.lastSeq && !brokeOff(state.view, view)) return state;
  // Rig and protocol are fixed for a run: keeping the first ones keeps everything that is worked out from them.
  const known = state.view?.id === view.id ? { ...view, rig: state.view.rig, protocol: state.view.protocol } : view;
  return { ...state, view: known, seenSeq: Math.max(state.seenSeq, view.lastSeq) };
}

/** What the database refused of a run is known to the page, and to nobody else any more. */
const brokeOff = (before: RunView, view: RunView): boolean =>
  view.quarantine !== null && before.quarantine === null && !isOver(before.state);

function withEvent(state: LiveState, event: ChainedEvent): LiveState {
  const newest = state.events.at(-1)?.seq ?? 0;
  if (event.seq <= newest) return state;
  const hole = newest > 0 && event.seq > newest + 1;
  return {
    ...state,
    events: [...state.events, event].slice(-keptEvents),
    seenSeq: Math.max(state.seenSeq, event.seq),
    missed: state.missed || hole,
  };
}

/** Rows by seq: a newer version of a row takes the place of the older one; one that has ended is never opened again. */
export function mergeRows(before: readonly StepRowView[], news: readonly StepRowView[]): readonly StepRowView[] {
  const bySeq = new Map(before.map((row) => [row.seq, row]));
  for (const row of news) {
    const known = bySeq.get(row.seq);
    if (known && known.endUtcMs !== null && row.endUtcMs === null) continue;
    bySeq.set(row.seq, row);
  }
  return [...bySeq.values()].sort((a, b) => a.seq - b.seq);
}

function withSamples(state: LiveState, data: LiveMessages['samples']): LiveState {
  const same = state.channel?.id === data.channelId;
  // A rig may have two: the first that came is followed, or the one that the protocol registers.
  if (state.channel !== null && !same && data.channel !== state.view?.protocol.evaluation?.channel) return state;
  const channel = { id: data.channelId, name: data.channel, unit: data.unit };
  const last = same ? (state.utcMs.at(-1) ?? -Infinity) : -Infinity;
  const fresh = data.utcMs.flatMap((at, index) => (at > last ? [index] : []));
  if (fresh.length === 0 && same) return state;
  const utcMs = [...(same ? state.utcMs : []), ...fresh.map((index) => data.utcMs[index] as number)];
  const value = [...(same ? state.value : []), ...fresh.map((index) => data.value[index] as number)];
  return { ...state, channel, ...thinned(utcMs, value) };
}

/** Above the limit the older half keeps every second sample: the near past stays in full. */
function thinned(utcMs: number[], value: number[]): { utcMs: number[]; value: number[] } {
  if (utcMs.length <= keptSamples) return { utcMs, value };
  const half = utcMs.length >> 1;
  const keep = (_: number, index: number) => index >= half || index % 2 === 0;
  return { utcMs: utcMs.filter(keep), value: value.filter(keep) };
}

/** A beat that is ahead of most by more than this was made while the server's clock was being set. */
const farAheadMs = 5_000;

/**
 * The time that the run keeps to minus the device's, ms; 0 before the first beat. Beats come late, never early, so the greatest is nearest to the
 * truth.
 */
export function serverOffsetMs({ offsets }: LiveState): number {
  const sorted = [...offsets].sort((a, b) => a - b);
  const middle = sorted[Math.floor((sorted.length - 1) / 2)] ?? 0;
  return sorted.findLast((offset) => offset - middle <= farAheadMs) ?? 0;
}
