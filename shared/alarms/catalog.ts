import type { AlarmRule } from './machine';

/**
 * Every kind of alarm: what it means, what it leads to, what to do and how soon. The acts are the run engine's own (practice of the trade,
 * no source); here stands whom each wakes.
 */

/**
 * `always`: rings at any hour. `allowed`: rings whoever is not in the hours of "do not ring". `morning`: told by mail in the morning, or at
 * once by day. `never`: stands on the screens and in the history only.
 */
export type Ringing = 'always' | 'allowed' | 'morning' | 'never';
export type AlarmPriority = 'high' | 'medium' | 'low';

export interface AlarmKind extends AlarmRule {
  title: string;
  cause: string;
  consequence: string;
  /** What to do. */
  answer: string;
  /** Time in which the answer still helps, min. */
  answerWithinMin: number;
  rings: Ringing;
  priority: AlarmPriority;
  /** Kinds of which this one is a mere consequence, on the same rig or in the whole lab: it does not ring beside them. */
  followsFrom: readonly string[];
}

const hour = 60;

/** What most alarms have: chatter of less than 2 s counts for nothing (quality of alarms, common practice). */
const usual = {
  onDelayS: 2,
  offDelayS: 2,
  latches: false,
  momentary: false,
  shelveAtMostMin: 12 * hour,
  followsFrom: [] as readonly string[],
};
const always = { ...usual, onDelayS: 0, rings: 'always', priority: 'high', answerWithinMin: 15 } as const;
const morning = { ...usual, rings: 'morning', priority: 'medium', answerWithinMin: 12 * hour } as const;
const logged = { ...usual, rings: 'never', priority: 'low', answerWithinMin: 24 * hour } as const;
/** What has to do with the safety of people is never out of sight for long. */
const grave = { ...always, shelveAtMostMin: hour } as const;
/** What happens at the rig and ends the motion. */
const atRig = ['unexpected-motion', 'limit', 'interlock', 'supply', 'controller-reset', 'home-edge'] as const;

const kinds = {
  'unexpected-motion': {
    ...grave,
    title: 'Moved without a command',
    cause: 'The turntable moved, or was stopped, by something else than the run.',
    consequence: 'The run is held with torque on. Somebody or something may be at the rig.',
    answer: 'Ring whoever may be there. Look at the rig before anything moves again, then resume or stop the run.',
    latches: true,
  },
  limit: {
    ...grave,
    title: 'Travel limit touched',
    cause: 'A motion met a travel limit.',
    consequence: 'The run is held. The counted position may be wrong, and masses may be near the glass.',
    answer: 'Somebody has to look at the rig. Home it before the next run.',
    latches: true,
  },
  interlock: {
    ...grave,
    title: 'Interlock or door opened',
    cause: 'The interlock of the room was opened while the rig was armed or a run was on.',
    consequence: 'The controller ended the motion, the arm is void and the run is held or stopped.',
    answer: 'Find out who is in the room. Close it and arm the rig again on site, then resume.',
  },
  supply: {
    ...grave,
    title: 'Motor supply lost',
    cause: 'The hard-wired stop was pressed, or the supply failed.',
    consequence: 'Motion ended at once and the position is lost. The run cannot be resumed.',
    answer: 'Ring the lab. Somebody has to be at the rig to home and arm it again.',
  },
  'controller-reset': {
    ...always,
    title: 'Controller restarted',
    cause: 'The controller lost power or its watchdog ended it.',
    consequence: 'The position is lost, the arm has ended and the run is held.',
    answer:
      'With hours of the night left and somebody near: home and arm the rig on site and start anew. Otherwise leave it for the morning.',
    followsFrom: ['supply'],
  },
  'proof-failed': {
    ...always,
    title: 'First pair is not as predicted',
    cause: 'Sign, size, period, noise or home edge of the first pair differ from the plan.',
    consequence: 'The run is held; without an answer the night is lost.',
    answer: 'Look at the figures of the proof. A caged pendulum, a wrong side or a blocked beam can be put right at the rig.',
  },
  'no-response': {
    ...always,
    title: 'Pendulum does not answer',
    cause: 'After a swing the pendulum neither swung at its own period nor about another place.',
    consequence: 'It may touch or be caged. The run is held; what is measured meanwhile is worth nothing.',
    answer: 'Look at strip and spot. A pendulum that touches has to be freed at the rig: hold the run until somebody is there.',
  },
  'no-deflection': {
    ...always,
    title: 'Held without deflection',
    cause: 'The deflection was silent in two dwells one after the other.',
    consequence: 'The run is held; without an answer the rest of the night is lost.',
    answer: 'Bring laser, camera or the computer that records back to work, from afar or at the rig, then resume.',
  },
  'home-edge': {
    ...always,
    title: 'Home edge off',
    cause: 'The edge of the home flag was not passed where the count said.',
    consequence: 'The run is held, and the dwells since the last good pass are marked.',
    answer: 'Belt, set screw or a knock: somebody has to look. Home before the next run.',
  },
  excursion: {
    ...always,
    onDelayS: 600,
    offDelayS: 60,
    title: 'Pendulum near its limit',
    cause: 'The deflection has been beyond 90 % of the clearance or of the range of the readout for a period or longer.',
    consequence: 'The pendulum may touch, or leave the scale. At the end of a dwell of which that is true the run holds: no swing follows.',
    answer: 'Look at the strip: a knock decays, a drift does not. Resume when it has decayed.',
  },
  held: {
    ...always,
    title: 'Run held',
    cause: 'The run came to rest and does not go on by itself.',
    consequence: 'No dwell is measured until somebody resumes.',
    answer: 'Read why, put it right, and resume from the run screen; or leave it held until the morning.',
    followsFrom: [...atRig, 'proof-failed', 'no-response', 'no-deflection', 'not-driven'],
  },
  'ended-early': {
    ...always,
    rings: 'allowed',
    momentary: true,
    title: 'Run ended before its time',
    cause: 'The run failed, or its protocol stopped it after an interruption.',
    consequence: 'The rest of the night is not measured. Nothing moves.',
    answer: 'Read why on the run screen. Start anew if the rig is sound and the night is long enough.',
    followsFrom: [...atRig, 'held', 'not-driven'],
  },
  'not-taken-up': {
    ...always,
    title: 'Run cannot be carried on',
    cause: 'An unfinished run was written by a version that this server does not know, or the database refuses what it has to save.',
    consequence: 'Nothing is done with it, and its rig stays blocked until somebody decides.',
    answer: 'Read the reason; start the server version that wrote it, or end the run on its screen.',
  },
  'not-driven': {
    ...always,
    offDelayS: 0,
    title: 'Nobody drives the rig',
    cause:
      'The process that drove the rig has ended or hangs, and none has taken it over within a minute, while a run has not ended, an arm stands or a start is near.',
    consequence:
      'The controller holds by itself. Nothing is measured by the protocol and no other alarm of the rig is found; a start will be missed. No sign of life is sent.',
    answer:
      'Look at the computer of the rig and at the server there: is it on, does it run, does it reach the database? It takes its runs up by itself when it is back.',
  },
  'link-lost': {
    ...logged,
    onDelayS: 5,
    title: 'Link to the controller lost',
    cause: 'No valid answer came over the line for 5 s.',
    consequence: 'The run goes on, holds or stops as its protocol says; it holds after 10 min at the latest.',
    answer: 'Look at cable, serial server and power of the controller.',
    followsFrom: ['supply', 'controller-reset'],
  },
  'deflection-silent': {
    ...logged,
    onDelayS: 60,
    title: 'No deflection',
    cause: 'The deflection channel has had no sample for over a minute during a run.',
    consequence: 'Dwells without data are not good and are made up, as far as the protocol allows.',
    answer: 'Look at the laser, the camera and the computer that records.',
  },
  'residual-high': {
    ...morning,
    title: 'Pendulum is unquiet',
    cause: 'The noise about the fit of the last dwell was beyond the limit of the protocol, or three times that of the rig document.',
    consequence: 'Such dwells say less. They are made up where the protocol sets a limit and counts good ones.',
    answer: 'Traffic, a door, wind or a distant earthquake: look at the strip, and note what it was.',
  },
  'few-good': {
    ...morning,
    title: 'Few good dwells',
    cause: 'The run has passed half of its dwells, and fewer than half of those that are done are good.',
    consequence: 'The night says less than was planned. The run ends with the pair under way, unless its last four dwells are good.',
    answer: 'Read in the step log why they are not good. Where what was wrong is over, let the run go on, on its page.',
    followsFrom: ['deflection-silent', 'residual-high', 'channel-silent', 'channel-level', 'channel-slope'],
  },
  'channel-level': {
    ...morning,
    title: 'Channel beyond its limits',
    cause: 'A channel left the limits that the lab set.',
    consequence: 'Dwells of this time may not be good.',
    answer: 'Look at the channel beside the strip: is it in step with the swings?',
  },
  'channel-slope': {
    ...morning,
    title: 'Channel changes too much',
    cause: 'A channel rose or fell faster, or spanned more, than the lab allows.',
    consequence: 'The rest line drifts with it; dwells of this time may not be good.',
    answer: 'Heating, sun or an open door: find what changed, and note it.',
  },
  'channel-silent': {
    ...morning,
    title: 'Channel silent',
    cause: 'A channel has had no sample for longer than the lab allows.',
    consequence: 'What it should have shown is not known.',
    answer: 'Look at the sensor, its battery and its way to the server.',
  },
  'broker-away': {
    ...morning,
    onDelayS: 60,
    title: 'MQTT broker away',
    cause: 'A broker that fills channels of the rig has not answered for a minute.',
    consequence: 'Those channels get nothing; what the broker does not keep for Evenfall is lost.',
    answer: 'Look at the broker, at the network to it, and at the reason on the page of the rig. It is tried again by itself.',
  },
  'camera-away': {
    ...morning,
    onDelayS: 60,
    title: 'Camera away',
    cause: 'A camera of the rig gave no picture at a moment of which a frame was wanted.',
    consequence: 'The step log has a note in the place of the frame. The run goes on.',
    answer: 'Look at the camera, at the network to it, and at the reason on the page of the rig. It is asked again at the next swing.',
  },
  'late-finish': {
    ...morning,
    ...{ onDelayS: 120, offDelayS: 120 },
    title: 'Run will pass the end of the night window',
    cause: 'Holds or bad dwells have moved the predicted finish beyond the hours of the room.',
    consequence: 'Cleaners, guards or the day’s work would meet a running rig.',
    answer:
      'A run that was planned to end within the window ends on a whole pair before it, by itself: what was measured counts. Where the room is free for longer, take that back on the page of the run.',
  },
  'not-armed': {
    ...usual,
    // Whoever made the schedule gets a mail.
    rings: 'never',
    priority: 'medium',
    answerWithinMin: 110,
    title: 'Scheduled start is not armed for',
    cause: 'A start is due within two hours and nobody on site answers for the rig until the end of that run.',
    consequence: 'The start will be missed.',
    answer: 'Somebody has to arm the rig on site before the start, or skip the start in the calendar.',
  },
  'missed-start': {
    ...morning,
    // As before.
    rings: 'never',
    ...{ momentary: true, onDelayS: 0 },
    title: 'Scheduled start missed',
    cause: 'A start check stood against it, or no server drove the rig.',
    consequence: 'Nothing moved; the start is not made up for.',
    answer: 'Read why in the calendar and put it right before the next start.',
    followsFrom: ['not-armed'],
  },
  'database-away': {
    ...logged,
    onDelayS: 4,
    title: 'Database away',
    cause: 'PostgreSQL did not answer for over 4 s.',
    consequence: 'Motion is brought to rest; the log is kept on the server’s own disk until the database is back.',
    answer: 'Look at the database server and its disk.',
  },
  'disk-low': {
    ...morning,
    ...{ onDelayS: 60, offDelayS: 60 },
    title: 'Disk nearly full',
    cause: 'Less than 10 % is free of the server’s disk, or of the database’s where that is known.',
    consequence: 'When nothing more can be stored, runs are held.',
    answer: 'Make room: old archives and files of imports go first.',
  },
  'clock-stepped': {
    ...morning,
    ...{ momentary: true, onDelayS: 0 },
    title: 'Clock stepped',
    cause: 'The clock of the server or of the controller jumped.',
    consequence:
      'A run that goes on keeps to the time it began with, and lasts no longer for it. What the controller’s clock told carries a larger uncertainty.',
    answer: 'See that the server follows a time server, and look at the step log.',
  },
  'sign-of-life-failed': {
    ...morning,
    onDelayS: 300,
    title: 'Sign of life is not taken',
    cause: 'The outside watcher has not taken the sign of life for over 5 min.',
    consequence: 'A server that dies would not be noticed, or the watcher tells of a dead server that lives.',
    answer: 'Look at the address in the settings of the lab and at the watcher itself.',
  },
} as const satisfies Record<string, AlarmKind>;

export type AlarmCode = keyof typeof kinds;
export const alarmKinds: Readonly<Record<AlarmCode, AlarmKind>> = kinds;
export const alarmCodes = Object.keys(kinds) as AlarmCode[];
export const isAlarmCode = (code: string): code is AlarmCode => code in kinds;
