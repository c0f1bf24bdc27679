import { formatDegrees } from '../lib/format-angle';
import { formatFixed, formatPercent } from '../lib/format-number';
import type { RigDocument } from '../rig/document';
import type { StationFacts, StationsFacts } from './station-facts';

export interface StationWord {
  /** `warning`: something to change; `said`: how it is and why. */
  kind: 'warning' | 'said';
  text: string;
}

/** Where 0.1 deg changes the torque by less than this, it is flat. */
const FLAT = 3e-4;
/** Relative u of G by the stations' angles that a careful geometry would not notice: practice has 0.4 % for 0.1 mm. */
const GREATEST_ANGLE_U = 1e-3;
/** Relative difference of |near| and |far|, and share of the greatest torque at near, from which on they are worth a warning. */
const UNEQUAL = 0.01;
const WEAK = 0.8;

export const gapWords = (gapM: number) => `${formatFixed(gapM * 1e3, { decimals: 1 })} mm`;

/** Where the masses should stand and why, a sentence or two each. */
export function stationWords(rig: RigDocument, facts: StationsFacts): StationWord[] {
  const { greatest, stations } = facts;
  const near = stations.find(({ name }) => name === 'near');
  const far = stations.find(({ name }) => name === 'far');
  const isFlat = Math.abs(greatest.perTenthDegree) < FLAT;
  const words = [
    said(
      isFlat
        ? `The torque is greatest at ${formatDegrees(greatest.angleDeg)}, and nothing keeps the masses from there. Stand near there and far in its mirror: at the top an angle that is wrong by 0.1° changes the torque by ${formatPercent(Math.abs(greatest.perTenthDegree))} only.`
        : `The greatest torque within reach is at ${formatDegrees(greatest.angleDeg)}, on the slope: closer in, the masses are kept out or would touch. There 0.1° changes the torque by ${formatPercent(Math.abs(greatest.perTenthDegree))}, so the angles of the stations have to be known well.`,
    ),
  ];
  if (near !== undefined) words.push(nearWords(near, facts));
  words.push(...angleWords(facts));
  if (near !== undefined && far !== undefined) words.push(...pairWords(near, far));
  return [...words, ...stations.flatMap((station) => standWords(rig, station))];
}

const said = (text: string): StationWord => ({ kind: 'said', text });
const warning = (text: string): StationWord => ({ kind: 'warning', text });

function nearWords({ torque, shareOfGreatest, angleDeg }: StationFacts, { greatest }: StationsFacts): StationWord {
  if (torque.value < 0)
    return warning(
      'At near the torque is negative, but near is the station with positive torque: its angle and that of far are exchanged.',
    );
  const off = formatDegrees(Math.abs(angleDeg - greatest.angleDeg));
  const where = `near stands ${off} from there and has ${formatPercent(shareOfGreatest, 4)} of that torque.`;
  return shareOfGreatest < WEAK
    ? warning(`${where} Closer to it the signal would grow by a factor ${(1 / shareOfGreatest).toPrecision(3)}.`)
    : said(where);
}

function angleWords({ angleRelativeU }: StationsFacts): StationWord[] {
  if (angleRelativeU === null) return [];
  const share = `The angles of near and far alone give G a relative u of ${formatPercent(angleRelativeU)}`;
  return angleRelativeU > GREATEST_ANGLE_U
    ? [
        warning(
          `${share}. Measure both from the same edge and approach each from its own side; an error that both share as an offset nearly cancels.`,
        ),
      ]
    : [said(`${share}, far less than the lengths do.`)];
}

function pairWords(near: StationFacts, far: StationFacts): StationWord[] {
  const [a, b] = [Math.abs(near.torque.value), Math.abs(far.torque.value)];
  const apart = Math.abs(a - b) / Math.max(a, b);
  if (near.torque.value * far.torque.value > 0) return [warning('near and far pull to the same side: their difference is no reversal.')];
  if (apart <= UNEQUAL) return [];
  return [
    warning(
      `near and far differ by ${formatPercent(apart)} in torque. Let far be the mirror of near, so that what is wrong with one is wrong with the other too.`,
    ),
  ];
}

function standWords({ pendulum }: RigDocument, { name, state, gapM }: StationFacts): StationWord[] {
  if (state === 'touching') return [warning(`At ${name} a source would stand in a ball: an angle, the orbit or a radius is wrong.`)];
  if (state === 'kept out') return [warning(`${name} lies outside the travel limits or within a keep-out arc: no protocol can go there.`)];
  const reachM = pendulum.arm.value * (pendulum.travel_rad ?? 0);
  if (gapM === null || gapM > reachM) return [];
  return [
    warning(`At ${name} ${gapWords(gapM)} stay between source and ball, less than the pendulum may swing: one knock and they touch.`),
  ];
}
