import { formatSignificant } from '@/shared/lib/format-number';
import { registeredDifferences } from '@/shared/evaluation/registered-differences';
import type { EvaluationResult } from '@/shared/evaluation/result';
import type { ProtocolDocument } from '@/shared/protocol/document';
import type { RigDocument } from '@/shared/rig/document';

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
  result: Pick<EvaluationResult, 'registered' | 'method'>,
  protocol: ProtocolDocument | null,
  channel: string | null,
): { words: string; differs: boolean } {
  if (result.registered === null) return { words: 'no evaluation was registered', differs: false };
  if (result.registered) return { words: 'as registered', differs: false };
  const registered = protocol?.evaluation;
  const differences = registered === undefined ? [] : registeredDifferences(registered, { method: result.method, channel });
  return { words: `not as registered${differences.length === 0 ? '' : `: ${differences.join('; ')}`}`, differs: true };
}

export const softwareWords = (version: string | null): string =>
  version === null ? 'The version of the software was not kept' : `Software Evenfall ${version}`;

const knownUnits: Record<string, string> = { reversal_rad: 'rad', modulation_rad: 'rad', period_s: 's', decayTime_s: 's' };

/** Unit of a budget line: that of the rig's quantity at the path. */
export function unitOfInput(input: string, rig: RigDocument | null): string {
  const known = knownUnits[input];
  if (known !== undefined) return known;
  let at: unknown = rig;
  for (const name of input.split(/[.[\]]/).filter(Boolean))
    at = typeof at === 'object' && at !== null ? (at as Record<string, unknown>)[name] : undefined;
  return typeof at === 'object' && at !== null && 'unit' in at && typeof at.unit === 'string' ? at.unit : '';
}

const methods: Record<EvaluationResult['method'], string> = {
  equilibrium: 'equilibrium method',
  period: 'period method',
  acceleration: 'acceleration method',
  modulation: 'modulation method',
};
export const methodWords = (method: EvaluationResult['method']): string => methods[method];
