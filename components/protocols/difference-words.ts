import { formatDuration } from '@/shared/lib/format-duration';
import type { Difference } from '@/shared/protocol/compare';
import type { Step } from '@/shared/protocol/document';
import { stepTitle, stepUnder } from './step-words';

export interface DifferenceWords {
  mark: 'added' | 'removed' | 'changed';
  /** Where: a step with its place, or the protocol itself. */
  where: string;
  before: string;
  after: string;
}

const fieldNames: Record<string, string> = {
  name: 'Name',
  notes: 'Notes',
  onInterruption: 'After an interruption',
  atEnd: 'When it has finished',
  evaluation: 'Registered evaluation',
  goodWhen: 'Good dwells',
  to: 'To',
  for_s: 'Time',
  periods: 'Periods',
  beat_periods: 'Beat',
  times: 'Times',
  until: 'Until',
  label: 'Label',
  speed_deg_s: 'Speed',
  acceleration_deg_s2: 'Acceleration',
  profile: 'Profile',
};

function valueWords(field: string, value: unknown): string {
  if (value === undefined) return 'not given';
  if (field === 'for_s' && typeof value === 'number') return formatDuration(value);
  if (field.endsWith('periods') && typeof value === 'number') return `${value} T`;
  if (typeof value === 'string') return value === '' ? 'empty' : value;
  if (typeof value === 'object' && value !== null)
    return Object.entries(value)
      .map(
        ([name, inner]) =>
          `${name === 'angle_deg' ? '' : `${name} `}${typeof inner === 'object' ? JSON.stringify(inner) : String(inner)}${name === 'angle_deg' ? '°' : ''}`,
      )
      .join(', ');
  return String(value);
}

const stepLine = (value: unknown): string => {
  const step = value as Step;
  const under = stepUnder(step, null);
  return under === '' ? stepTitle(step) : `${stepTitle(step)}, ${under}`;
};

/** The positions of a step's path: `2.repeat.1.swing` → `2.1`. */
const place = (path: string | null): string =>
  (path ?? '')
    .split('.')
    .filter((_, index) => index % 2 === 0)
    .join('.');

/** One difference between two protocols in words. */
export function differenceWords(difference: Difference): DifferenceWords {
  const { kind, field, pathBefore, pathAfter, before, after } = difference;
  const path = pathAfter ?? pathBefore;
  if (field === '') {
    return {
      mark: kind,
      where: `Step ${place(path)}`,
      before: before === undefined ? '' : stepLine(before),
      after: after === undefined ? '' : stepLine(after),
    };
  }
  const name = fieldNames[field] ?? field;
  const kindOf = path?.split('.').at(-1) ?? '';
  return {
    mark: kind,
    where: path === null ? name : `Step ${place(path)}, ${kindOf}: ${name.toLowerCase()}`,
    before: valueWords(field, before),
    after: valueWords(field, after),
  };
}
