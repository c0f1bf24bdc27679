import type { ThemeColors } from '@/components/theme';
import type { IconName } from '@/components/ui';
import type { ControllerView, LineMessage, LinkHealthView } from '@/shared/contracts/link';
import { formatAgo, formatTimeUncertainty } from '@/shared/lib/format-duration';
import { formatFixed, formatSignificant, NARROW_SPACE } from '@/shared/lib/format-number';

/** What is known of a line in the words of the page. Pure. */

export interface HealthRow {
  label: string;
  value: string;
  /** Uncertainty or remark beside the value. */
  aside?: string | undefined;
  state: 'good' | 'look' | 'bad' | 'plain';
  /** What to do; empty while all is well. */
  advice: string;
}

/** A round trip above this makes hold and stop feel late (common practice, no source). */
const slowRoundTripMs = 50;
/** Timestamps of motion are wanted to 0.2 ms; above 5 ms they say little (common practice, no source). */
const roughClockMs = 5;

const conditions: Record<LinkHealthView['condition'], { value: string; state: HealthRow['state']; advice: string }> = {
  ready: { value: 'live', state: 'good', advice: '' },
  opening: {
    value: 'opening',
    state: 'look',
    advice: 'It should answer within a few seconds. If it does not: is the board powered, is this the right port?',
  },
  lost: {
    value: 'lost',
    state: 'bad',
    advice: 'The server goes on trying by itself. See to plug, cable and the power of the board; nothing moves meanwhile.',
  },
  refused: {
    value: 'refused',
    state: 'bad',
    advice: 'What answers is no controller that this version can drive. Choose another line, or renew its firmware.',
  },
  closed: { value: 'closed', state: 'look', advice: 'This server does not drive the rig at the moment.' },
};

const milliseconds = (ms: number) => `${formatSignificant(ms, 2)}${NARROW_SPACE}ms`;

/** A clock offset, which may be hours (the controller counts from its start), to the digits its uncertainty bears. */
function offsetText(ms: number, uMs: number): string {
  const decimals = Math.min(6, Math.max(0, Math.ceil(-Math.log10(Math.max(uMs / 1000, 1e-6))) + 1));
  return `${formatFixed(ms / 1000, { decimals, signed: true })}${NARROW_SPACE}s`;
}

const share = (ppm: number) => `${formatSignificant(ppm, 3, { signed: true })}${NARROW_SPACE}ppm`;

/** Rows of the live health; `nowMs` by the server's clock. */
export function healthRows({ health, controller }: Pick<LineMessage, 'health' | 'controller'>, nowMs: number): HealthRow[] {
  return [
    {
      label: 'State',
      ...conditions[health.condition],
      ...(health.keptOutBy === null ? {} : { advice: 'It obeys another server: let that one have the rig, or take the controller over.' }),
      aside: health.detail === '' ? undefined : health.detail,
    },
    answerRow(health, nowMs),
    roundTripRow(health),
    ...lossRows(health),
    ...clockRows(health),
    {
      label: 'Firmware',
      value: controller?.firmware ?? '–',
      aside: health.protocol === null ? undefined : `line protocol ${health.protocol}`,
      state: 'plain',
      advice: '',
    },
    { label: 'Boot identifier', value: controller?.bootId ?? '–', aside: 'changes with each restart', state: 'plain', advice: '' },
  ];
}

function answerRow({ lastReplyAt }: LinkHealthView, nowMs: number): HealthRow {
  const ageS = lastReplyAt === null ? null : Math.max(0, (nowMs - Date.parse(lastReplyAt)) / 1000);
  const late = ageS === null || ageS > 2;
  return {
    label: 'Last answer',
    value: ageS === null ? 'none yet' : formatAgo(ageS),
    state: late ? 'bad' : 'good',
    advice: late ? 'A healthy line answers twice a second.' : '',
  };
}

function roundTripRow({ roundTripMs, roundTripP50Ms, roundTripP95Ms }: LinkHealthView): HealthRow {
  const slow = (roundTripP95Ms ?? roundTripMs ?? 0) > slowRoundTripMs;
  const most = roundTripP95Ms === null ? undefined : `19 of 20 within ${milliseconds(roundTripP95Ms)}`;
  return {
    label: 'Round trip',
    value: roundTripP50Ms === null && roundTripMs === null ? '–' : milliseconds(roundTripP50Ms ?? roundTripMs ?? 0),
    aside: most,
    state: slow ? 'look' : 'plain',
    advice: slow ? 'Slow: a serial server far away, or a busy computer. Times of motion stay right, hold and stop take longer.' : '',
  };
}

function lossRows({ discardedLines, discardedBytes, droppedByController, retries, reconnects }: LinkHealthView): HealthRow[] {
  const garbled = discardedLines > 0 || (droppedByController ?? 0) > 0;
  return [
    {
      label: 'Set aside here',
      value: String(discardedLines),
      aside: discardedLines === 1 ? `line, ${discardedBytes} bytes` : `lines, ${discardedBytes} bytes`,
      state: discardedLines === 0 ? 'good' : 'look',
      advice: '',
    },
    {
      label: 'Dropped there',
      value: droppedByController === null ? '–' : String(droppedByController),
      aside: `${droppedByController === 1 ? 'line' : 'lines'}, by the controller`,
      state: droppedByController === null ? 'plain' : droppedByController === 0 ? 'good' : 'look',
      advice: garbled
        ? 'None of them moved anything. If the numbers grow: another rate at the other end, a bad earth, or a cable too long beside the motor leads.'
        : '',
    },
    { label: 'Asked again', value: String(retries), aside: retries === 1 ? 'request' : 'requests', state: 'plain', advice: '' },
    {
      label: 'Opened again',
      value: String(reconnects),
      aside: reconnects === 1 ? 'time' : 'times',
      state: reconnects === 0 ? 'plain' : 'look',
      advice: '',
    },
  ];
}

function clockRows({ clock, drift }: LinkHealthView): HealthRow[] {
  const rough = clock !== null && clock.uMs > roughClockMs;
  return [
    {
      label: 'Clock offset',
      value: clock === null ? '–' : offsetText(clock.offsetMs, clock.uMs),
      aside: clock === null ? undefined : formatTimeUncertainty(clock.uMs / 1000),
      state: rough ? 'look' : 'plain',
      advice: rough ? 'It becomes better by itself within a minute on a quiet line.' : '',
    },
    {
      label: 'Clock drift',
      value: drift === null ? '–' : share(drift.ppm),
      aside: drift === null ? 'known after half a minute' : `± ${formatSignificant(drift.uPpm, 2)}${NARROW_SPACE}ppm`,
      state: 'plain',
      advice: '',
    },
  ];
}

export interface InputRow {
  label: string;
  words: string;
  state: HealthRow['state'];
}

const row = (label: string, on: boolean, [onWords, offWords, off = 'look']: [string, string, InputRow['state']?]): InputRow => ({
  label,
  words: on ? onWords : offWords,
  state: on ? 'good' : off,
});

/** Inputs and outputs of the controller as they are now. */
export const inputRows = (controller: ControllerView): InputRow[] => [
  row('Interlock', controller.interlockClosed, ['closed', 'open', 'bad']),
  row('Motor supply', controller.supplyPresent, ['present', 'lost', 'bad']),
  row('Arm key', controller.armKey, ['on: somebody is at the rig', 'off']),
  row('Position', controller.positionKnown, ['known', 'not known: home first']),
  row('Drivers', controller.driversOn, ['on', 'off: the table turns freely']),
  {
    label: 'Home flag',
    words: controller.homeFlagCovered ? 'covered: clockwise of the edge' : 'free: counter-clockwise of the edge',
    state: 'plain',
  },
  { label: 'Motion lease', words: controller.leaseLive ? 'live: it may move' : 'not live: nothing can move', state: 'plain' },
  row('Warning', !controller.warningDue, ['not due', 'comes for 10 s before the next move']),
];

export const marks: Record<HealthRow['state'], { icon: IconName; tone: keyof ThemeColors }> = {
  good: { icon: 'passed', tone: 'good' },
  look: { icon: 'note', tone: 'lamp' },
  bad: { icon: 'warning', tone: 'danger' },
  plain: { icon: 'other', tone: 'faint' },
};
