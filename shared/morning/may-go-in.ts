import type { RigView } from '../contracts/rigs';
import { formatDegrees } from '../lib/format-angle';
import { formatClock, formatClockWithZone } from '../lib/format-time';
import { slipToleranceDeg } from '../rig/position-proof';

/** Whether somebody may reach into the rig now, and what that is read off. */
export interface MayGoIn {
  answer: 'yes' | 'no' | 'unknown';
  /** Why, and what to do first. */
  words: string;
  /** Where the sources stand, motor, door, arm, and when the controller was heard last. */
  facts: string[];
}

type RigNow = Pick<RigView, 'live' | 'arm' | 'arming' | 'locks' | 'activeRun' | 'document'>;

/** The most pressing reason counts; what the controller has not told is never taken for good. */
export function mayGoIn(rig: RigNow, timeZone: string): MayGoIn {
  return { ...judged(rig, timeZone), facts: factsOf(rig, timeZone) };
}

function judged({ live, arm, arming, locks, activeRun }: RigNow, timeZone: string): Pick<MayGoIn, 'answer' | 'words'> {
  if (live.condition === 'ready' && live.moving) return { answer: 'no', words: 'The turntable is moving.' };
  if (activeRun !== null) return { answer: 'no', words: `A run of ${activeRun.protocolName} is on: hold or stop it first.` };
  if (arm !== null) {
    const until = formatClockWithZone(Date.parse(arm.until), { timeZone, weekday: true });
    return { answer: 'no', words: `Armed for ${arm.name} until ${until}: it may begin to move. Disarm it, or set your own lock.` };
  }
  if (arming !== null) return { answer: 'no', words: `${arming.name} is arming it: it may begin to move when the exit delay is over.` };
  if (live.condition === 'ready' && live.armKey === true) return { answer: 'no', words: 'Its arm key is on. Turn it off first.' };
  if (live.condition !== 'ready')
    return { answer: 'unknown', words: 'The controller is not heard. Look at the rig itself, and turn its key off before you reach in.' };
  const [lock] = locks;
  if (lock !== undefined) return { answer: 'yes', words: `${lock.name} is at work in it: ask there. Nothing moves while the lock is on.` };
  return { answer: 'yes', words: 'Nothing moves before somebody arms it with the key. Set your lock before you reach in.' };
}

/** The station that the table stands at, as well as its microsteps and the home edge can tell. */
const stationNear = (rig: RigView['document'], angleDeg: number): string | undefined =>
  Object.keys(rig.stations).find((name) => Math.abs((rig.stations[name]?.value ?? Number.NaN) - angleDeg) <= slipToleranceDeg(rig));

function factsOf({ live, arm, document }: RigNow, timeZone: string): string[] {
  const { angleDeg, positionKnown, driversOn, interlockClosed, lastReplyAt } = live;
  const sources = angleDeg === null || !positionKnown ? 'not known' : `at ${stationNear(document, angleDeg) ?? formatDegrees(angleDeg)}`;
  const told = (value: boolean | null, yes: string, no: string) => (value === null ? 'not known' : value ? yes : no);
  return [
    `sources ${sources}`,
    `motor ${told(driversOn, 'on', 'off')}`,
    `door ${told(interlockClosed, 'closed', 'open')}`,
    arm === null ? 'not armed' : 'armed',
    lastReplyAt === null ? 'controller never heard' : `heard ${formatClock(Date.parse(lastReplyAt), { timeZone })}`,
  ];
}
