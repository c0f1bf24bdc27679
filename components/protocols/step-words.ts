import type { IconName } from '@/components/ui';
import { formatDegrees } from '@/shared/lib/format-angle';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatSignificant } from '@/shared/lib/format-number';
import type { RepeatStep, Step, StepKind, SwingTarget } from '@/shared/protocol/document';
import { waitOf } from '@/shared/protocol/wait';

/** Steps as the editor names them. Pure. */

export const kindNames: Record<StepKind, string> = {
  home: 'Home',
  swing: 'Swing',
  dwell: 'Dwell',
  kick: 'Kick',
  settle: 'Settle',
  wait: 'Wait',
  proof: 'Proof',
  mark: 'Mark',
  prompt: 'Prompt',
  rotate: 'Rotate',
  repeat: 'Repeat',
};

/** What a step is for, in the sheet that adds one. */
export const kindUses: Partial<Record<StepKind, string>> = {
  home: 'Find the home edge: the position becomes known.',
  swing: 'Turn the sources to a station or an angle.',
  dwell: 'Stand still and measure. Counted in the reversals.',
  kick: 'Set the pendulum swinging and record how it rings down: period and decay.',
  settle: 'Wait for creep and heat to die down, for a time or until calm. Not evaluated.',
  wait: 'Go on at a time of day in the lab, or when a channel is quiet.',
  rotate: 'Turn the sources continuously, then back. For the modulation method; on a rig free to turn.',
  proof: 'Say after the first pair whether the night is worth running.',
  prompt: 'Let people in: go on when somebody has confirmed.',
  mark: 'Put a line of yours into the log.',
  repeat: 'Do some steps again and again.',
};

export const stepIcons: Record<StepKind, IconName> = {
  home: 'home',
  swing: 'swing',
  dwell: 'dwell',
  kick: 'kick',
  settle: 'settle',
  wait: 'wait',
  proof: 'tick',
  mark: 'mark',
  prompt: 'people',
  rotate: 'repeat',
  repeat: 'repeat',
};

/** The station a swing goes to, or its angle. */
export const targetWords = (to: SwingTarget): string => (typeof to === 'string' ? to : formatDegrees(to.angle_deg));

function repeatTitle({ times, until, counting }: RepeatStep): string {
  if (times !== undefined && counting === 'good') return `Repeat for ${times} good ${times === 1 ? 'pass' : 'passes'}`;
  if (times !== undefined) return `Repeat ${times === 1 ? 'once' : `${times} times`}`;
  if (until !== undefined && 'localTime' in until) return `Repeat until ${until.localTime}`;
  if (until !== undefined) return `Repeat until u is ${formatSignificant(until.relativeStatisticalU * 100, 2)} %`;
  return 'Repeat';
}

/** The step in three or four words: `Swing to near`, `Repeat 16 times`, `Wait until 22:00`. */
export function stepTitle(step: Step): string {
  switch (step.kind) {
    case 'swing':
      return `Swing to ${targetWords(step.to)}`;
    case 'repeat':
      return step.order === 'shuffled' ? `${repeatTitle(step)}, shuffled` : repeatTitle(step);
    case 'wait':
      return 'localTime' in step.until ? `Wait until ${step.until.localTime}` : `Wait for ${step.until.channel}`;
    case 'mark':
      return `Mark “${step.label}”`;
    case 'kick':
      return `Kick, ${formatSignificant(step.amplitude_urad / 1000, 2)} mrad`;
    case 'rotate':
      return `Rotate ${Math.abs(step.turns) === 1 ? 'a turn' : `${Math.abs(step.turns)} turns`}`;
    case 'settle':
      return step.calmWhen === undefined ? 'Settle' : 'Settle until calm';
    case 'prompt':
      return `Prompt “${step.text}”`;
    default:
      return kindNames[step.kind];
  }
}

const times = (count: number, unit: string) =>
  `${formatSignificant(count, 3)
    .replace(/(\.\d*?)0+$/, '$1')
    .replace(/\.$/, '')} ${unit}`;

const boundsWords = ({ atMost }: RepeatStep) => (atMost === undefined ? '' : `at most ${atMost}`);

function waitWords(step: Step): string {
  const wait = waitOf(step);
  if (wait === null) return '';
  const after = { hold: 'then hold', continue: 'then go on', stop: 'then stop' }[wait.otherwise];
  return `at most ${formatDuration(wait.atMostS)}, ${after}`;
}

function lengthWords(step: Step): string {
  switch (step.kind) {
    case 'swing':
      return step.profile === 'shaped' ? 'shaped' : 'plain';
    case 'dwell':
      if (step.beat_periods !== undefined) return `beat of ${times(step.beat_periods, 'T')}`;
      return step.periods === undefined ? '' : times(step.periods, 'T');
    case 'wait':
      return 'localTime' in step.until
        ? { continue: '', hold: 'hold if past', 'next day': 'next day if past' }[step.until.ifPast ?? 'continue']
        : waitWords(step);
    case 'repeat':
      return [step.steps.length === 0 ? 'nothing in it yet' : '', boundsWords(step)].filter((part) => part !== '').join(' · ');
    case 'rotate':
      return `${step.turns > 0 ? '↺' : '↻'} a turn in ${formatDuration(step.period_s)}, then back`;
    case 'settle':
      return waitWords(step);
    case 'prompt':
      return step.atMost_s === undefined ? '' : `at most ${formatDuration(step.atMost_s)}`;
    case 'proof':
      return { hold: 'else hold', continue: 'else go on', stop: 'else stop' }[step.otherwise ?? 'hold'];
    default:
      return '';
  }
}

/** The quiet line under the title: how, for how long, and the step's own label. */
export function stepUnder(step: Step, durationS: number | null): string {
  const length =
    durationS === null || (durationS === 0 && ['mark', 'proof', 'prompt'].includes(step.kind)) ? '' : formatDuration(durationS);
  const label = step.kind === 'mark' || step.label === undefined ? '' : `“${step.label}”`;
  return [lengthWords(step), length, label].filter((part) => part !== '').join(' · ');
}
