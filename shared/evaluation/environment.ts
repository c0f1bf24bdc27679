import type { Archive, ArchivedSeries } from '../archive/read-archive';
import type { ArchiveWarning } from '../archive/archive-types';
import { UnusableArchive } from '../archive/unusable-archive';
import { UNIT_OF_G } from '../lib/format-number';
import { formatUncertain } from '../lib/format-uncertain';
import type { SidedValue } from '../statistics/drift';
import { regressedDifference, type LinearEstimate, type RegressedDifference } from '../statistics/regressed-difference';
import { studentTProbability } from '../statistics/student-t';
import { bilinear } from '../statistics/symmetric';
import type { Analysis } from './analysis';
import type { Budget } from './budget';
import { samplesIn } from './dwell-samples';
import type { EvaluationPlan } from './registration';
import type { RegressionResult } from './result';
import { middleS } from './reversal';
import { centreOf } from './ring-down-fit';
import { NoSolutionError, solveG, type GSystem } from './solve-g';

/** What the channels of the surroundings would change, beside the result and never in it. */
export interface Regressions {
  regressions: RegressionResult[];
  warnings: ArchiveWarning[];
}

/** A coefficient is told of that chance alone would show this rarely: beyond 3 u where u is well known. */
const telling = 0.0027;

/**
 * For each channel of the role `environment`: how the dwells' centres go with its mean over each dwell, and the difference and G with and
 * without it. Dwells in which the channel is silent are left out of both.
 */
export function regressionsOf(archive: Archive, plan: EvaluationPlan, found: { analysis: Analysis; budget: Budget | null }): Regressions {
  const regressions: RegressionResult[] = [];
  const warnings: ArchiveWarning[] = [];
  for (const { name } of archive.channels.filter(({ role }) => role === 'environment')) {
    try {
      const one = regressionOn(archive.readChannel(name), plan, { ...found, exclusions: archive.exclusions });
      if (one === null) continue;
      regressions.push(one);
      if (chanceOf(one) < telling) warnings.push(goesWith(one));
    } catch (error) {
      if (!(error instanceof UnusableArchive)) throw error;
      warnings.push({
        code: 'environment-unreadable',
        message: `The channel "${name}" was not compared with the dwells: ${error.message}`,
      });
    }
  }
  return { regressions, warnings };
}

function regressionOn(
  series: ArchivedSeries,
  plan: EvaluationPlan,
  { analysis, budget, exclusions }: { analysis: Analysis; budget: Budget | null; exclusions: Archive['exclusions'] },
): RegressionResult | null {
  const { segments, found, reversal } = analysis;
  if (found === null || reversal === null) return null;
  const dwells = reversal.members.flatMap(({ segment }) => {
    const own = segments[segment];
    if (own === undefined) return [];
    const { reading } = samplesIn(own.window, series, exclusions);
    return reading.length === 0 ? [] : [{ segment, own, mean: reading.reduce((sum, one) => sum + one, 0) / reading.length }];
  });
  const centres = dwells.map(({ segment }) => centreOf(found, segment));
  const sided: SidedValue[] = dwells.map(({ own }, k) => ({
    timeS: middleS(own),
    side: own.window.side as 1 | -1,
    value: (centres[k] as { value: number }).value,
  }));
  const drift = { kind: plan.drift, order: plan.order };
  const without = regressedDifference(sided, null, drift);
  const withIt = regressedDifference(
    sided,
    dwells.map(({ mean }) => mean),
    drift,
  );
  if (without === null || withIt === null || withIt.coefficient === null) return null;
  const knownOf = ({ value, u, weights }: LinearEstimate) => {
    const common = [0, 1].map((j) => centres.reduce((sum, { shift }, k) => sum + (weights[k] as number) * (shift[j] as number), 0));
    return { value, u: Math.sqrt(u ** 2 + bilinear(common, found.alphaCovariance, common)) };
  };
  const answer = ({ difference }: RegressedDifference) => {
    const reversalRad = knownOf(difference);
    const members = dwells.map(({ segment }, k) => ({ segment, weight: difference.weights[k] as number }));
    return { reversal_rad: reversalRad, G: gWith(analysis, budget, { reversalRad, members }) };
  };
  return {
    channel: series.info.name,
    unit: series.info.unit,
    dwells: dwells.length,
    degreesOfFreedom: withIt.degreesOfFreedom,
    coefficient: { ...knownOf(withIt.coefficient), unit: `rad/${series.info.unit}` },
    without: answer(without),
    with: answer(withIt),
  };
}

interface OtherDifference {
  reversalRad: { value: number; u: number };
  members: { segment: number; weight: number }[];
}

/** G of another difference of the same dwells; its u that of the result with the share of the difference exchanged. */
function gWith(
  { system, solution, segments }: Analysis,
  budget: Budget | null,
  { reversalRad, members }: OtherDifference,
): { value: number; u: number | null } | null {
  if (system === null || solution === null) return null;
  const phiRad = (segment: number) => ((segments[segment]?.window.angleDeg ?? 0) * Math.PI) / 180;
  const weighed = members.map(({ segment, weight }) => ({ phiRad: phiRad(segment), weight }));
  const bigG = solvedOrNull({ ...system, reversalRad: reversalRad.value, members: weighed }, solution.bigG);
  if (bigG === null) return null;
  const line = budget?.lines.find(({ input }) => input === 'reversal_rad');
  if (budget === null || line === undefined) return { value: bigG, u: null };
  const rest = Math.max(0, budget.u ** 2 - line.contribution ** 2);
  return { value: bigG, u: Math.sqrt(rest + (line.sensitivity * reversalRad.u) ** 2) };
}

/** A part taken off may leave a difference that no G gives. */
function solvedOrNull(system: GSystem, startG: number): number | null {
  try {
    return solveG(system, startG).bigG;
  } catch (error) {
    if (error instanceof NoSolutionError) return null;
    throw error;
  }
}

/** How probable a coefficient so far from 0 is where nothing goes with the channel. */
const chanceOf = ({ coefficient: { value, u }, degreesOfFreedom }: RegressionResult) =>
  2 * studentTProbability(-Math.abs(value) / u, degreesOfFreedom);

function goesWith({ channel, coefficient, with: free }: RegressionResult): ArchiveWarning {
  const then = free.G === null ? 'near minus far' : 'G';
  const value = free.G === null ? { ...free.reversal_rad, unit: 'rad' } : { ...free.G, unit: UNIT_OF_G };
  return {
    code: 'environment',
    message: `The dwells go with the channel "${channel}": ${formatUncertain(coefficient)}. Nothing was taken off; without that part ${then} would be ${formatUncertain(value)}.`,
  };
}
