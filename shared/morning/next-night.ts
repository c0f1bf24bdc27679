import { alarmKinds, type AlarmCode } from '../alarms/catalog';
import { alarmOfHold } from '../alarms/of-holds';
import type { ChainedEvent } from '../archive/run-records';
import type { MorningSheet, MorningTick } from '../contracts/morning';
import type { BudgetLine, EvaluationResult } from '../evaluation/result';
import { quantityAt } from '../evaluation/budget-inputs';
import { inputWords } from '../evaluation/input-words';
import { formatPercent } from '../lib/format-number';
import type { RigDocument } from '../rig/document';

/** What to do before the next night, each with what it would bring. */

type Next = MorningSheet['next'][number];

/** Found anew from the data of every night; all else of the budget is geometry and comes from measurements of the rig. */
const ofTheNight: ReadonlySet<string> = new Set(['reversal_rad', 'modulation_rad', 'period_s', 'decayTime_s']);

const sharesOf = (lines: readonly BudgetLine[]) => lines.reduce((sum, { share }) => sum + share, 0);

/** Shares of u²(G) that the night and the geometry have; null without a budget. */
export function sharesOfBudget(budget: EvaluationResult['budget']): MorningSheet['shares'] {
  if (budget === null || budget.length === 0) return null;
  const night = sharesOf(budget.filter(({ input }) => ofTheNight.has(input)));
  return { night, geometry: sharesOf(budget) - night };
}

interface NextFacts {
  ticks: readonly MorningTick[];
  events: readonly ChainedEvent[];
  dwells: MorningSheet['dwells'];
  result: EvaluationResult | null;
  /** Why the newest evaluation came to no result; null where it did, or where there was none. */
  failure: string | null;
  rig: RigDocument;
}

const mostPressing = 3;

/** At most three, the most pressing first; never empty. */
export function nextNight(facts: NextFacts): Next[] {
  const next = [...faults(facts), ...quiet(facts)];
  return [...next, ...gains(facts)].slice(0, mostPressing);
}

/** What must be put right first. */
function faults({ ticks, events, result, failure }: NextFacts): Next[] {
  const bad = (code: MorningTick['code']) => ticks.find((tick) => tick.code === code && tick.ok === false);
  const first = (words: string): Next => ({ act: 'first', words });
  const alarm = lastAlarm(events);
  const slipped = bad('edge');
  return [
    ...(bad('record') === undefined ? [] : [first(`${bad('record')?.words ?? ''}: say so with every figure of this night.`)]),
    ...(slipped === undefined ? [] : [first(`${slipped.words}. Look at belt and motor, and home the rig.`)]),
    ...(alarm === null || alarm === 'home-edge' ? [] : [first(alarmKinds[alarm].answer)]),
    ...(bad('first-pair') === undefined ? [] : [first(`${bad('first-pair')?.words ?? ''}. Find out why before another night is spent.`)]),
    ...(bad('samples') === undefined
      ? []
      : [first(`${bad('samples')?.words ?? ''}. Look at light, camera and the computer that records.`)]),
    ...(result !== null
      ? []
      : [
          first(
            failure === null
              ? 'Bring the deflection in, or choose its channel, and evaluate the run.'
              : `The evaluation failed: ${failure}. Look at the data, and evaluate again.`,
          ),
        ]),
  ];
}

/** What held or ended the run last, where nobody has put it right and resumed; null where that was a person. */
function lastAlarm(events: readonly ChainedEvent[]): AlarmCode | null {
  const last = events.findLast(({ kind }) => turns.has(kind));
  const code = last?.data['code'];
  return typeof code === 'string' && last?.kind !== 'resumed' && last?.kind !== 'finished' ? alarmOfHold(code) : null;
}

const turns: ReadonlySet<string> = new Set(['held', 'stopped', 'failed', 'resumed', 'finished']);

/** Half of the dwells lost to the surroundings: another night like it is not worth its wear. */
function quiet({ dwells, events }: NextFacts): Next[] {
  if (dwells.done === 0 || 2 * dwells.good >= dwells.done) return [];
  const why = events.flatMap(({ kind, data }) => (kind === 'dwell-not-good' && Array.isArray(data['why']) ? [String(data['why'][0])] : []));
  const last = why.at(-1);
  return [
    {
      act: 'wait',
      words: `${dwells.done - dwells.good} of ${dwells.done} dwells do not count${last === undefined ? '' : `, the last for: ${last}`}. Wait for a quieter night.`,
    },
  ];
}

function gains({ result, rig }: NextFacts): Next[] {
  const shares = sharesOfBudget(result?.budget ?? null);
  const relativeU = result?.relativeU ?? null;
  if (result === null || shares === null || relativeU === null)
    return result === null ? [] : [{ act: 'go', words: 'Go: nothing stands against another night.' }];
  const better = (share: number) => formatPercent(relativeU * Math.sqrt(Math.max(0, 1 - share)));
  const now = formatPercent(relativeU);
  const after = better(shares.night / 2);
  const go: Next = {
    act: 'go',
    words:
      after === now
        ? `Another night like this one hardly makes u(G)/G smaller: the geometry has ${formatPercent(shares.geometry)} of its square.`
        : `Go: a second night like this one takes u(G)/G from ${now} to ${after}.`,
  };
  const greatest = (result.budget ?? []).filter(({ input }) => !ofTheNight.has(input)).sort((a, b) => b.share - a.share)[0];
  // What shares its error with others may make u(G) larger when it is known better by itself.
  if (greatest === undefined || quantityAt(rig, greatest.input.split('.'))?.group !== undefined) return [go];
  const measure: Next = {
    act: 'first',
    words: `Measure the ${inputWords(greatest.input)} twice as well: that takes u(G)/G from ${now} to ${better(0.75 * greatest.share)}.`,
  };
  return 0.75 * greatest.share > shares.night / 2 ? [measure, go] : [go, measure];
}
