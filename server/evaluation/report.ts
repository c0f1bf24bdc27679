import { inputWords, isCorrelation, unitOfInput } from '@/shared/evaluation/input-words';
import { driftWords, sameSamplesWords } from '@/shared/evaluation/method-words';
import { monteCarloWords } from '@/shared/evaluation/monte-carlo-words';
import { residualAllan } from '@/shared/evaluation/residual-allan';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { formatFixed, formatPercent, formatSignificant, UNIT_OF_G } from '@/shared/lib/format-number';
import { formatExact, formatUncertain } from '@/shared/lib/format-uncertain';
import type { ReportInput } from '../interfaces/report';
import { ReportPage, wholePlotPt } from './report-page';
import { plotAllan, plotCentres, plotFits, plotReversals } from './report-plots';

const ofG = (value: number, u: number | null) => formatUncertain({ value, u, unit: UNIT_OF_G });
const utc = (ms: number | null) =>
  ms === null
    ? '–'
    : new Date(ms)
        .toISOString()
        .replace('T', ' ')
        .replace(/\.\d+Z$/, ' UTC');
const micro = 1e6;

/** The measurement report of one evaluation as a PDF: G with its uncertainty, how it was found, what it rests on. Every number has its u and its unit beside it. */
export function measurementReport(input: ReportInput, { compress = true } = {}): Promise<Uint8Array> {
  const { run, evaluation, result } = input;
  const title = `Measurement report: ${run.protocolName} on ${run.rigName}`;
  const page = new ReportPage({ title, dated: new Date(Date.parse(input.frozen?.at ?? evaluation.at)), compress });
  page.title(title);
  about(page, input);
  resultPart(page, input);
  quantities(page, result);
  methodsPart(page, result);
  budgetPart(page, input);
  reversalsPart(page, result);
  dwellsPart(page, result);
  plotFits(page, input.curves);
  residualsPart(page, input);
  remarks(page, result);
  excludedPart(page, input);
  logPart(page, input);
  return page.end();
}

function about(page: ReportPage, { run, evaluation, frozen, result, chainHead }: ReportInput): void {
  if (run.rehearsal) page.line('A rehearsal on the simulated rig: no measurement.', { strong: true });
  page.line(`Run ${run.id}, from ${utc(run.startedAtUtcMs)} to ${utc(run.endedAtUtcMs)}; operator ${run.operator}.`);
  page.line(
    `Rig ${run.rigName}, revision ${run.rigRevision}; mass set ${run.massSet}; protocol ${run.protocolName}, revision ${run.protocolRevision}.`,
  );
  page.line(
    `Evaluation ${evaluation.id} at ${evaluation.at} by ${evaluation.by}, channel ${evaluation.channel ?? '–'}; software Evenfall ${evaluation.software ?? 'of a version not kept'}.`,
  );
  page.line(frozen === null ? 'Not frozen.' : `Frozen at ${frozen.at} by ${frozen.by}: ${frozen.reason}`);
  page.line(
    result.chain.valid === true
      ? `Chain of ${result.chain.events} events, whole and unchanged. Head of the chain (SHA-256): ${chainHead ?? '–'}`
      : 'There is no event chain to check.',
  );
}

function resultPart(page: ReportPage, { result }: ReportInput): void {
  const { G, relativeU, codata } = result;
  page.heading('Result');
  if (G === null) {
    page.line('This run gives no G; the remarks say why.', { strong: true });
    return;
  }
  page.line(`G = ${ofG(G.value, G.u)}`, { strong: true, size: 14 });
  page.line(
    G.u === null
      ? 'No standard uncertainty can be given: too few dwells count to judge it by. This value is no result.'
      : `In brackets the standard uncertainty (k = 1)${relativeU === null ? '' : `, ${formatPercent(relativeU)} of G`}${G.degreesOfFreedom === null ? '' : `; ${formatSignificant(G.degreesOfFreedom, 2)} degrees of freedom`}.`,
  );
  page.line(`CODATA 2022: ${ofG(codata.value, codata.u)}${codata.En === null ? '' : `; En = ${formatSignificant(codata.En, 2)}`}.`);
  const trials = monteCarloWords(result);
  if (trials !== null) page.line(trials);
  page.line(`Method: ${result.method}${result.registered === null ? '' : result.registered ? ', as registered' : ', not as registered'}.`);
}

function quantities(
  page: ReportPage,
  { reversal_rad: reversal, period_s: period, decayTime_s: decay, kappa_N_m: kappa, alignment }: EvaluationResult,
): void {
  page.heading('Measured quantities');
  const offset = alignment?.clockOffset_s ?? null;
  const rows: [string, { value: number; u: number | null } | null, string][] = [
    ['near − far', reversal, 'rad'],
    ['damped period', period, 's'],
    ['decay time', decay, 's'],
    ['torsion constant κ', kappa, 'N m/rad'],
    [alignment?.applied === true ? 'clock offset, applied' : 'clock offset, not applied', offset, 's'],
  ];
  const told = rows.flatMap(([name, of, unit]) => (of === null ? [] : [[name, formatUncertain({ value: of.value, u: of.u, unit })]]));
  page.table([['Quantity', 'Value and u'], ...told], [0.4, 0.6]);
}

function methodsPart(page: ReportPage, { methods }: EvaluationResult): void {
  if (methods === undefined) return;
  page.heading('Methods beside each other');
  const rows = methods.map(({ method, G, difference, why }) => [
    method,
    G === null ? (why ?? 'none') : ofG(G.value, G.u),
    difference === null ? '–' : ofG(difference.value, difference.u),
  ]);
  page.table([['Method', 'G', 'Difference from the result'], ...rows], [0.18, 0.45, 0.37]);
  page.line(`The u of a difference leaves out what the methods share of the rig. ${sameSamplesWords}`, { size: 8 });
}

function budgetPart(page: ReportPage, { result: { budget }, rig }: ReportInput): void {
  if (budget === null) return;
  page.heading('Budget of uncertainty', 100);
  const lines = [...budget].sort((a, b) => b.share - a.share);
  page.bars(lines.slice(0, longestBars).map(({ input, share }) => ({ words: inputWords(input), share, figure: formatPercent(share) })));
  const rows = lines.map(({ input, value, u, contribution, share }) => [
    inputWords(input),
    isCorrelation(input) ? `r = ${formatFixed(value, { decimals: 2 })}` : formatUncertain({ value, u, unit: unitOfInput(input, rig) }),
    formatExact({ value: contribution, unit: UNIT_OF_G }),
    formatPercent(share),
  ]);
  page.table([['Input', 'Value and u', 'Contribution to u(G)', 'Share'], ...rows], [0.3, 0.28, 0.3, 0.12]);
}

function reversalsPart(page: ReportPage, result: EvaluationResult): void {
  const { reversal_rad: reversal, drifts = [] } = result;
  if (reversal === null) return;
  page.heading('Reversals over the night', wholePlotPt);
  plotReversals(page, result);
  if (drifts.length < 2) return;
  const rows = drifts.map(({ drift, reversal_rad: { value, u } }) => [
    driftWords(drift),
    formatUncertain({ value: value * 1e3, u: u === null ? null : u * 1e3, unit: 'mrad' }),
  ]);
  page.table([['Drift taken off by', 'near − far'], ...rows], [0.5, 0.5]);
}

function dwellsPart(page: ReportPage, { dwells }: EvaluationResult): void {
  page.heading('Dwells', wholePlotPt);
  plotCentres(page, { dwells });
  const rows = dwells.map(({ seq, station, theta_rad: theta, samples, used, why }) => [
    String(seq),
    station,
    theta === null ? 'no fit' : formatUncertain({ value: theta.value * 1e3, u: theta.u * 1e3, unit: 'mrad' }),
    String(samples),
    used ? 'used' : `not used: ${why ?? 'no reason given'}`,
  ]);
  page.table([['Row', 'Station', 'Centre', 'Samples', ''], ...rows], [0.1, 0.14, 0.28, 0.13, 0.35]);
}

function residualsPart(page: ReportPage, { curves }: ReportInput): void {
  const points = residualAllan(curves);
  if (points.length === 0) return;
  page.heading('Allan deviation of the residuals', wholePlotPt);
  plotAllan(page, points);
  const rows = points.map(({ tauS, deviationRad, u }) => [
    `${formatSignificant(tauS, 3)} s`,
    formatUncertain({ value: deviationRad * micro, u: u * micro, unit: 'µrad' }),
  ]);
  page.table([['Averaging time', 'Overlapping Allan deviation and u'], ...rows], [0.4, 0.6]);
}

function remarks(page: ReportPage, { warnings }: EvaluationResult): void {
  if (warnings.length === 0) return;
  page.heading('Remarks');
  for (const { message } of warnings) page.line(message);
}

/** What was left out by hand, each stretch with who left it out and why: nobody has to look for it elsewhere. */
function excludedPart(page: ReportPage, { excluded }: ReportInput): void {
  page.heading('Excluded by hand');
  if (excluded.length === 0) {
    page.line('No samples were excluded by hand.');
    return;
  }
  const rows = excluded.map(({ startUtcMs, endUtcMs, by, reason }) => [
    utc(startUtcMs),
    `${formatFixed((endUtcMs - startUtcMs) / 1000, { decimals: 0 })} s`,
    by,
    reason,
  ]);
  page.table([['From', 'Length', 'By', 'Reason'], ...rows], [0.26, 0.1, 0.2, 0.44]);
}

/** The moves and dwells, so far as the rows say when and where; the whole log is in the archive. */
function logPart(page: ReportPage, { steps }: ReportInput): void {
  page.heading('Extract of the step log');
  const rows = steps
    .slice(0, longestLog)
    .map(({ seq, kind, station, startUtcMs, uStartS, angleEndDeg, uAngleDeg, outcome }) => [
      String(seq),
      kind,
      station,
      `${new Date(startUtcMs).toISOString()} ± ${formatSignificant(uStartS * 1e3, 2)} ms`,
      angleEndDeg === null ? '–' : formatUncertain({ value: angleEndDeg, u: uAngleDeg, unit: 'deg' }),
      outcome ?? '–',
    ]);
  page.table([['Row', 'Step', 'Station', 'Start and u', 'Turntable', 'Outcome'], ...rows], [0.08, 0.12, 0.12, 0.38, 0.18, 0.12]);
  if (steps.length > longestLog) page.line(`${steps.length - longestLog} more rows are in the archive of the run.`);
}

/** Bars of the budget; the table has all its lines. */
const longestBars = 6;

const longestLog = 60;
