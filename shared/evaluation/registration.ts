import type { Archive } from '../archive/read-archive';
import { listOf } from '../archive/read-archive';
import { UnusableArchive } from '../archive/unusable-archive';
import type { ClockChoice } from './clock-choice';
import { registeredDifferences } from './registered-differences';

export type EvaluationMethod = 'equilibrium' | 'period' | 'acceleration' | 'modulation';
export const evaluationMethods: readonly EvaluationMethod[] = ['equilibrium', 'period', 'acceleration', 'modulation'];

export interface EvaluationOptions {
  method?: EvaluationMethod;
  channel?: string;
  clock?: ClockChoice;
  /** Bound of equivalence of an empty control, rad. */
  boundRad?: number;
  /** Monte Carlo trials, 0 (the default here) for none. */
  trials?: number;
  /** Whether the other methods are tried too and put beside the one of the result. */
  besides?: boolean;
}

/** What is to be done, and how far that is what the protocol registered beforehand. */
export interface EvaluationPlan {
  method: EvaluationMethod;
  drift: 'aba' | 'polynomial' | 'gls';
  order: number;
  channel: string;
  clock: ClockChoice;
  /** In words, how this differs from what was registered; null where nothing was registered. */
  differences: string[] | null;
}

/**
 * Options first, then what the protocol registered, then the defaults.
 * @throws UnusableArchive when the channel is not plain.
 */
export function evaluationPlan(archive: Archive, options: EvaluationOptions): EvaluationPlan {
  const registered = archive.registered;
  const method = options.method ?? registered?.method ?? 'equilibrium';
  const drift = registered?.drift ?? 'aba';
  const channel = chooseChannel(archive, options.channel ?? registered?.channel ?? null);
  const clock = options.clock ?? { kind: 'estimated' };
  const differences =
    registered === undefined || registered === null ? null : registeredDifferences(registered, { method, channel, clock });
  return { method, drift, order: registered?.order ?? 1, channel, clock, differences };
}

function chooseChannel(archive: Archive, wanted: string | null): string {
  const deflections = archive.channels.filter(({ role }) => role === 'deflection');
  const names = listOf(deflections.map(({ name }) => name));
  if (wanted === null) {
    const [only, ...others] = deflections;
    if (only === undefined)
      throw new UnusableArchive(
        { file: 'datapackage.json' },
        `the archive holds no channel with the role deflection; its channels: ${listOf(archive.channels.map(({ name }) => name))}`,
      );
    if (others.length > 0)
      throw new UnusableArchive(
        { file: 'datapackage.json' },
        `the archive holds the deflection channels ${names}; say which with --channel`,
      );
    return only.name;
  }
  const found = archive.channels.find(({ name }) => name === wanted);
  if (found === undefined)
    throw new UnusableArchive({ file: 'datapackage.json' }, `there is no channel "${wanted}"; deflection channels: ${names}`);
  if (found.role !== 'deflection')
    throw new UnusableArchive(
      { file: 'datapackage.json' },
      `the channel "${wanted}" has ${found.role === '' ? 'no role' : `the role ${found.role}`}; deflection channels: ${names}`,
    );
  return found.name;
}
