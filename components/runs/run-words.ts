import type { RunState, RunSummary, RunView, StepRowView } from '@/shared/contracts/runs';
import { laneOf, type Lane } from '@/components/charts/strip-model';
import { formatClock } from '@/shared/lib/format-time';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { parseStepPath, stepAt } from '@/shared/protocol/step-path';
import { targetWords } from '@/components/protocols/step-words';
import type { IconName, Tone } from '@/components/ui';

/** The words of a run. Pure. */

const capital = (text: string) => text.charAt(0).toUpperCase() + text.slice(1);

export interface StateMark {
  icon: IconName;
  tone: Tone;
}

const stateWords: Record<RunState, string> = {
  rehearsing: 'Rehearsing',
  starting: 'Starting',
  running: 'Running',
  holding: 'Holding: coming to rest',
  held: 'Held',
  stopping: 'Stopping',
  finished: 'Finished',
  stopped: 'Stopped',
  failed: 'Failed',
};
const stateMarks: Record<RunState, StateMark> = {
  rehearsing: { icon: 'repeat', tone: 'lamp' },
  starting: { icon: 'start', tone: 'lamp' },
  running: { icon: 'start', tone: 'lamp' },
  holding: { icon: 'hold', tone: 'lamp' },
  held: { icon: 'hold', tone: 'lamp' },
  stopping: { icon: 'stop', tone: 'danger' },
  finished: { icon: 'passed', tone: 'good' },
  stopped: { icon: 'stop', tone: 'danger' },
  failed: { icon: 'failed', tone: 'danger' },
};

export const isOver = (state: RunState): boolean => state === 'finished' || state === 'stopped' || state === 'failed';

const laneMark = (lane: Lane): StateMark =>
  lane === 'near' ? { icon: 'near', tone: 'near' } : lane === 'far' ? { icon: 'far', tone: 'far' } : { icon: 'clear', tone: 'dim' };

type TitledRow = Pick<StepRowView, 'kind' | 'station' | 'label' | 'path' | 'outcome'>;

/** What the target of a step is looked up in. */
export type TargetSource = Pick<ProtocolDocument, 'steps' | 'atEnd'>;

/** Where a swing goes or was to go: a swing that was cut short ended at no station, so its row names none and the protocol tells. */
function swingTarget(row: Pick<StepRowView, 'station' | 'path'>, protocol: TargetSource | null): string {
  if (row.station !== '' || protocol === null) return row.station;
  if (row.path === 'atEnd.swing') return protocol.atEnd?.station ?? '';
  const path = parseStepPath(row.path);
  const step = path === null ? null : stepAt(protocol, path);
  return step?.kind === 'swing' ? targetWords(step.to) : '';
}

/** Of a step in several moves: which one, or that the sources stand between two. */
function moveName({ path, kind }: Pick<StepRowView, 'path' | 'kind'>, protocol: TargetSource | null): string {
  const name = /\.([a-z]{1,2})$/.exec(path)?.[1];
  if (name !== undefined) return `, move ${name}`;
  const at = protocol === null || path === 'atEnd.swing' ? null : parseStepPath(path);
  const step = at === null || protocol === null ? null : stepAt(protocol, at);
  return kind === 'kick' || (step?.kind === 'swing' && step.profile === 'shaped') ? ', between two moves' : '';
}

/** A row of the log as a title: `Dwell, near side`, `Swing to far`, `Swing to near, cut short`, `Wait`. */
export function stepTitle(row: TitledRow, protocol: TargetSource | null): string {
  const side = laneOf(row.station) === 'other' ? (row.station === '' ? '' : ` at ${row.station}`) : `, ${row.station} side`;
  switch (row.kind) {
    case 'home':
      return 'Home: finding the edge';
    case 'swing': {
      const target = swingTarget(row, protocol);
      return `Swing${target === '' ? '' : ` to ${target}`}${moveName(row, protocol)}${row.outcome === 'cut short' ? ', cut short' : ''}`;
    }
    case 'rotate':
      return `Rotate${row.path.endsWith('.b') ? ', turning back' : ''}${row.outcome === 'cut short' ? ', cut short' : ''}`;
    case 'mark':
      return row.label === '' ? 'Mark' : `Mark: ${row.label}`;
    case 'ring-down':
      return `Ring-down${side}`;
    case 'kick':
      return `Kick${moveName(row, protocol)}`;
    default:
      return capital(row.kind) + (['wait', 'proof', 'prompt'].includes(row.kind) ? '' : side);
  }
}

export const stepMark = (row: Pick<StepRowView, 'kind' | 'station'>): StateMark =>
  row.kind === 'home' ? { icon: 'home', tone: 'text' } : laneMark(laneOf(row.station));

/** What the run is doing, in a few words, with the mark that says the same without colour. */
export function runTitle(view: Pick<RunView, 'state' | 'current' | 'protocol'>): { words: string; mark: StateMark } {
  if (view.state === 'running' && view.current !== null)
    return { words: stepTitle(view.current, view.protocol), mark: stepMark(view.current) };
  return { words: stateWords[view.state], mark: stateMarks[view.state] };
}

export const stateWord = (state: RunState): string => stateWords[state];
export const stateMark = (state: RunState): StateMark => stateMarks[state];

/** How a run ended, in one line: `Finished at 07:11`, `Stopped at 02:14: by Anna`. */
export function outcomeTitle(view: Pick<RunSummary, 'state' | 'endedAt'>, timeZone: string): string {
  const at = view.endedAt === null ? '' : ` at ${formatClock(Date.parse(view.endedAt), { timeZone })}`;
  return `${stateWords[view.state]}${at}`;
}

const kinds: Record<string, string> = {
  started: 'Started',
  'run-started': 'Started',
  held: 'Held',
  resumed: 'Resumed',
  stopped: 'Stopped',
  finished: 'Finished',
  failed: 'Failed',
  archived: 'Archived',
  'edge-not-told': 'Not measured: the controller never told of this edge of a motion',
  'home-edge': 'Passed the home edge',
  'flag-end': 'Passed the other end of the home flag',
  'server-restarted': 'Taken up by a server',
  'order-drawn': 'Order of the pass drawn',
};

/** The kind of an event as words: `link-lost` → `Link lost`. */
export const eventWords = (kind: string): string => kinds[kind] ?? capital(kind.replaceAll(/[-_.]/g, ' '));
