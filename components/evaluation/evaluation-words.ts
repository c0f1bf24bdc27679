import { formatDuration } from '@/shared/lib/format-duration';
import { formatPercent, formatSignificant, UNIT_OF_G } from '@/shared/lib/format-number';
import { formatExact, formatUncertain } from '@/shared/lib/format-uncertain';
import { registeredDifferences } from '@/shared/evaluation/registered-differences';
import { whiteUntil, type ResidualAllanPoint } from '@/shared/evaluation/residual-allan';
import type { EvaluationResult, RegressionResult } from '@/shared/evaluation/result';
import { studentTProbability } from '@/shared/statistics/student-t';
import type { ProtocolDocument } from '@/shared/protocol/document';

/** The words of an evaluation. Pure. */

/** En = (G − Gc) / (2 √(u² + uc²)); within ± 1 the two agree within their expanded uncertainties (ISO 13528:2022, 9.7). */
export function enWords(En: number | null): string {
  if (En === null) return 'no comparison without an uncertainty';
  const number = formatSignificant(En, 2);
  return `En ${number} against CODATA 2022: ${Math.abs(En) <= 1 ? 'agrees' : 'disagrees'} at k = 2`;
}

/** Above a hundred the number tells nothing more: t for 95.45 % is then within 1.5 % of 2 (GUM, table G.2). */
export const freedomWords = (degrees: number): string =>
  degrees > 100 ? 'more than 100 degrees of freedom' : `${formatSignificant(degrees, 2)} degrees of freedom`;

/** Whether the evaluation is the one that was registered with the protocol, and if not, how it differs. */
export function registeredWords(
  result: Pick<EvaluationResult, 'registered' | 'method'> & Partial<Pick<EvaluationResult, 'alignment'>>,
  protocol: ProtocolDocument | null,
  channel: string | null,
): { words: string; differs: boolean } {
  if (result.registered === null) return { words: 'no evaluation was registered', differs: false };
  if (result.registered) return { words: 'as registered', differs: false };
  const registered = protocol?.evaluation;
  const differences =
    registered === undefined
      ? []
      : registeredDifferences(registered, {
          method: result.method,
          channel,
          ...(result.alignment?.decided === undefined ? {} : { clock: result.alignment.decided }),
        });
  return { words: `not as registered${differences.length === 0 ? '' : `: ${differences.join('; ')}`}`, differs: true };
}

export const softwareWords = (version: string | null): string =>
  version === null ? 'The version of the software was not kept' : `Software Evenfall ${version}`;

const methods: Record<EvaluationResult['method'], string> = {
  equilibrium: 'equilibrium method',
  period: 'period method',
  acceleration: 'acceleration method',
  modulation: 'modulation method',
};
export const methodWords = (method: EvaluationResult['method']): string => methods[method];

/** Whether another method agrees with the result: En = d / (2 u(d)), within ± 1 for agreement. Null: it cannot be told. */
export function agreementOf({ value, u }: { value: number; u: number | null }): { agrees: boolean | null; words: string } {
  const difference = formatUncertain({ value, u, unit: UNIT_OF_G }, { signed: true });
  if (u === null || u === 0)
    return { agrees: null, words: `differs from the result by ${difference}; without a u nobody can say whether they agree` };
  const En = value / (2 * u);
  const agrees = Math.abs(En) <= 1;
  const words = `differs from the result by ${difference}, En ${formatSignificant(En, 2)}: ${agrees ? 'agrees' : 'disagrees'} at k = 2`;
  return { agrees, words };
}

/** How sure it is that the dwells go with a channel, and by how many it was told. */
export function regressionWords({ coefficient: { value, u }, dwells, degreesOfFreedom }: RegressionResult): string {
  const chance = 2 * studentTProbability(-Math.abs(value) / u, degreesOfFreedom);
  const rare = chance < 0.001 ? 'under 0.1\u202f% of the time' : `${formatPercent(chance)} of the time`;
  return `pendulum angle over the channel, ${dwells} dwells; chance alone would show as much ${rare}`;
}

/** What the Allan deviation says, for those who do not see the plot and those who do; null for too few points. */
export function allanWords(points: readonly ResidualAllanPoint[]): string | null {
  const [first] = points;
  const told = whiteUntil(points);
  if (first === undefined || told === null) return null;
  const start = `${formatUncertain({ value: first.deviationRad * 1e6, u: first.u * 1e6, unit: 'µrad' })} at ${formatDuration(first.tauS)}`;
  if (told.departs === null) return `${start}; from there it falls as white noise does, up to ${formatDuration(told.untilS)}.`;
  const beyond =
    told.untilS === first.tauS ? 'From there on' : `It falls as white noise does up to ${formatDuration(told.untilS)}; beyond that`;
  const departs =
    told.departs === 'above'
      ? 'it stands above: something slower than the readout is left, such as seismic noise, a wandering zero or a motion that the fit does not know'
      : 'it stands below, because the fit takes slow parts out or the noise of the readout is not white';
  return `${start}. ${beyond} ${departs}.`;
}

/** What a trial does to G and to its u, in words. */
export function changeWords(now: { value: number; u: number | null }, then: { value: number; u: number | null }): string {
  const change = `${formatExact({ value: then.value - now.value, unit: UNIT_OF_G }, { signed: true })} from the result`;
  if (now.u === null || then.u === null || now.value === 0 || then.value === 0) return change;
  const relative = (of: { value: number; u: number | null }) => formatPercent((of.u ?? 0) / Math.abs(of.value), 3);
  return `${change}; u ${relative(then)} of G instead of ${relative(now)}`;
}

/** What the estimated offset of the channel's clock is called. */
export function clockName(alignment: EvaluationResult['alignment']): string {
  if (alignment?.decided !== undefined) return 'clock offset by the data';
  return alignment?.applied === true ? 'clock offset, applied' : 'clock offset, not applied';
}

/** What was decided about the channel's clock, and what G would be otherwise; empty where there is nothing to say. */
export function clockWords({ alignment, G }: Pick<EvaluationResult, 'alignment' | 'G'>): string {
  const { decided, otherwise } = alignment ?? {};
  const done =
    decided === undefined || decided.kind === 'estimated'
      ? ''
      : decided.kind === 'left'
        ? 'The clock of the channel was left as it is, as somebody decided.'
        : `The clock of the channel was set by ${formatSignificant(decided.offset_s, 4)} s, as somebody decided.`;
  if (otherwise === undefined || otherwise.G === null || G === null) return done;
  const change = otherwise.G / G.value - 1;
  const size = Math.abs(change) < 1e-9 ? 'the same' : `${formatPercent(Math.abs(change))} ${change < 0 ? 'smaller' : 'greater'}`;
  const other = otherwise.offset_s === 0 ? 'Left as it is' : `Set by ${formatSignificant(otherwise.offset_s, 4)} s`;
  return `${done} ${other}, G would be ${size}.`.trim();
}
