import type { Archive } from '../archive/read-archive';
import type { ArchiveWarning } from '../archive/archive-types';
import { RAD_PER_DEG } from '../physics/constants';
import { geometryOf, torquePerG } from '../physics/torque';
import type { Analysis } from './analysis';
import type { EvaluationPlan } from './registration';

/** From this many near and far dwells on their scatter says something. */
const enoughDwells = 6;
const greatestDisagreement = 3;

export const hasSwings = ({ steps }: Archive) => steps.some(({ kind }) => kind === 'swing');

const noReversal: ArchiveWarning = {
  code: 'few-dwells',
  message: 'No near and far dwell that count follow each other, so there is neither a difference nor a G.',
};

/** What a reader of the result must know of how it came about. */
export function warningsOf(archive: Archive, analysis: Analysis, { method, clock }: EvaluationPlan): ArchiveWarning[] {
  const { free, solution, clockOffset } = analysis;
  const warnings = [...oscillatorWarnings(free), ...clockWarnings(clockOffset, clock, method)];
  if (method === 'modulation' && solution !== null && solution.bigG < 0)
    warnings.push({
      code: 'sign',
      message: 'The swing with the turntable has the wrong sign, so G came out negative: look at lever.sense.',
    });
  return method === 'period' || method === 'modulation' ? warnings : [...warnings, ...reversalWarnings(archive, analysis)];
}

/** For the methods that look at near minus far. */
function reversalWarnings(archive: Archive, { reversal, solution }: Analysis): ArchiveWarning[] {
  const warnings: ArchiveWarning[] = [];
  if (reversal === null) return hasSwings(archive) ? [noReversal] : [];
  const dwells = reversal.members.length;
  if (dwells < enoughDwells) {
    const consequence =
      reversal.known === null ? 'their scatter gives no uncertainty, so G has none' : 'their scatter gives a rough uncertainty only';
    warnings.push({ code: 'few-dwells', message: `Only ${dwells} dwells count: ${consequence}.` });
  }
  if (reversal.notAlternating) {
    warnings.push({
      code: 'not-alternating',
      message: 'The dwells that count do not alternate between near and far, so a polynomial drift was removed instead of ABA windows.',
    });
  }
  const { rig } = archive;
  const near = rig.stations.near;
  if (solution !== null && near !== undefined && torquePerG(geometryOf(rig), near.value * RAD_PER_DEG) < 0) {
    warnings.push({
      code: 'near-not-positive',
      message: 'The torque at stations.near is negative; near should be the station with positive torque.',
    });
  }
  if (solution !== null && solution.bigG < 0) {
    warnings.push({
      code: 'sign',
      message: 'Near minus far has the wrong sign, so G came out negative: look at lever.sense and at the stations.',
    });
  }
  return warnings;
}

/** Where the evaluation is not, or not only, what was decided before the data were seen; exclusions are told of in any case. */
export function registrationWarnings({ exclusions }: Archive, { differences }: Pick<EvaluationPlan, 'differences'>): ArchiveWarning[] {
  const warnings: ArchiveWarning[] = [];
  if (differences !== null && differences.length > 0)
    warnings.push({ code: 'not-as-registered', message: `The evaluation is not the registered one: ${differences.join('; ')}.` });
  if (exclusions.length > 0) {
    const stretches = exclusions.length === 1 ? 'one stretch' : `${exclusions.length} stretches`;
    const seconds = lengthTogether(exclusions) / 1000;
    warnings.push({
      code: 'excluded-by-hand',
      message: `${differences === null ? 'The' : 'Beside the registered rules the'} samples of ${stretches}, ${seconds.toFixed(0)} s together, were excluded by hand (exclusions.csv).`,
    });
  }
  return warnings;
}

function oscillatorWarnings(free: Analysis['free']): ArchiveWarning[] {
  const warnings: ArchiveWarning[] = [];
  const { omega, gamma } = free.disagreement;
  if (omega !== null && omega > greatestDisagreement) {
    warnings.push({
      code: 'period-disagrees',
      message: `The ring-down and measured.period_s of rig.json disagree by ${omega.toFixed(1)} u; their weighted mean was used.`,
    });
  }
  if (gamma !== null && gamma > greatestDisagreement) {
    warnings.push({
      code: 'decay-disagrees',
      message: `The ring-down and measured.decayTime_s of rig.json disagree by ${gamma.toFixed(1)} u; their weighted mean was used.`,
    });
  }
  if (free.decayTime === null) {
    warnings.push({
      code: 'decay-unknown',
      message:
        'Neither the dwells nor measured.decayTime_s tell how fast the ringing dies away, so the torsion constant was taken without damping: it is too small.',
    });
  }
  return warnings;
}

/** Smaller offsets are common and do no harm, s. */
const greatestClockS = 0.01;
/** So far the guards about the swings cover an offset, s. */
const harmlessClockS = 1;

const bySwings = `Shaped swings leave the pendulum nearly still, so the record hardly shows when they were. Up to ${harmlessClockS} s do no harm to G; if the clocks may differ by more, set them alike, or begin the night with three plain swings.`;

const byPhase =
  'A rotation tells it by the phase of the swing, which hangs on period and decay time as well. It does no harm to G of this method, which the size of the swing tells, whatever its phase; a kick with its ring-down before the turns tells period and decay time, and so the clock, better.';

const becameOfIt = (choice: EvaluationPlan['clock']): string =>
  choice.kind === 'estimated'
    ? 'this was taken off'
    : choice.kind === 'left'
      ? 'it was left as it is, as was asked for'
      : `instead ${String(choice.offset_s)} s was taken off, as was asked for`;

function clockWarnings(
  offset: Analysis['clockOffset'],
  choice: EvaluationPlan['clock'],
  method: EvaluationPlan['method'],
): ArchiveWarning[] {
  if (offset === null) return [];
  const warnings: ArchiveWarning[] = [];
  const way = `${Math.abs(offset.value).toFixed(3)} s ${offset.value > 0 ? 'later' : 'earlier'}`;
  if (Math.abs(offset.value) > Math.max(2 * offset.u, greatestClockS)) {
    warnings.push({
      code: 'clock-offset',
      message: `The channel's clock shows ${way} than the step log's (u ${offset.u.toFixed(3)} s); ${becameOfIt(choice)}.`,
    });
  }
  if (2 * offset.u > harmlessClockS) {
    warnings.push({
      code: 'clock-poorly-known',
      message: `How the channel's clock stands against the step log's is poorly known: u ${offset.u.toFixed(1)} s. ${method === 'modulation' ? byPhase : bySwings}`,
    });
  }
  return warnings;
}

/** Length of all stretches in ms, what lies in more than one counted once. */
function lengthTogether(stretches: Archive['exclusions']): number {
  let [covered, sum] = [-Infinity, 0];
  for (const { startUtcMs, endUtcMs } of [...stretches].sort((a, b) => a.startUtcMs - b.startUtcMs)) {
    sum += Math.max(0, endUtcMs - Math.max(startUtcMs, covered));
    covered = Math.max(covered, endUtcMs);
  }
  return sum;
}
