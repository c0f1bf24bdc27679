import { initialTransition, transition } from 'xstate';
import type { RunStart } from '@/shared/archive/run-records';
import { explainStartRefusal, newContext, noteBeginning, startRefusal, startRun } from './beginning';
import {
  confirmByItself,
  confirmPrompt,
  confirmRefusal,
  endGivenUp,
  endMet,
  givesUp,
  isMet,
  isPrompt,
  lookForEnd,
  noteDoor,
  noteLook,
  policyOfWait,
  refuseConfirm,
} from './awaiting';
import { nothingOut } from './draft';
import { noteDwellLook } from './dwells';
import {
  awaitReturn,
  becomeFailed,
  becomeFinished,
  becomeHeld,
  becomeStopped,
  beginHold,
  beginStop,
  carryOn,
  noteDatabaseBack,
  noteRefusedResume,
  noteRestart,
  resume,
  resumeRefusal,
  returnRefusal,
  takeAheadUnseen,
} from './halting';
import { requestHold, requestStop } from './requested-halts';
import { noteReady, noteReset, noteStandstill, noteStrangeMotion } from './observations';
import { type Advance, CHART_VERSION, type ChartState, type RunContext, type RunEvent, type RunSnapshot } from './run-context';
import { askAgain, dropAhead, expectEnd, finishMotion, noteBegan, noteEnded, takeAhead } from './motions';
import { slipFoundHoming } from './position';
import { chooseNext, endStanding, explainHoldAfterStep, lookBeforeEnd, lookIsDue, sendAhead } from './steps';
import {
  act,
  bootedAnew,
  chart,
  type ChartContext,
  type ChartInput,
  comingToRest,
  finishes,
  endedAhead,
  explainController,
  explainHomeFailure,
  explainNoReturn,
  fails,
  heard,
  isAhead,
  holdsFor,
  isCancelled,
  isMine,
  isOver,
  isOverdue,
  mayMoveAgainst,
  motionEnds,
  pick,
  refusals,
  refusedAtRest,
  returns,
  skips,
  strangeMotion,
  underWay,
  when,
} from './chart-parts';

/**
 * The run as a state chart: a pure function from a snapshot and an event to the next snapshot, the rows and events to be
 * saved and the effects to be performed after that. It holds no timers and no promises: `deadlineOf` says when the
 * driver is to send `deadline`.
 */

const machine = chart.createMachine({
  id: 'run',
  // XState asks for a context without input, too, for an actor of each transition that nobody uses; a throw is dear there.
  context: ({ input }: { input: ChartInput | undefined }) =>
    input === undefined ? ({} as ChartContext) : { start: input.start, run: newContext(input.start, input.nowUtcMs), out: nothingOut },
  initial: 'starting',
  states: {
    starting: {
      on: {
        ...underWay,
        begin: [
          {
            guard: when((draft) => startRefusal(draft) !== null, noteBeginning),
            target: 'failed',
            actions: act(noteBeginning, explainStartRefusal),
          },
          { guard: ({ event }) => event.controller !== null, target: 'choosing', actions: act(noteBeginning, startRun) },
          { actions: act(noteBeginning) },
        ],
        'link.ready': [
          {
            guard: when((draft) => startRefusal(draft) !== null, noteReady),
            target: 'failed',
            actions: act(noteReady, explainStartRefusal),
          },
          { target: 'choosing', actions: act(noteReady, startRun) },
        ],
        'link.refused-controller': { target: 'failed', actions: act(explainController) },
        deadline: fails('no-answer', 'The controller never answered. Check that it is powered and that the right port is chosen.'),
      },
    },
    choosing: {
      always: [
        { guard: ({ context }) => context.run.next === 'homing', target: 'homing' },
        { guard: ({ context }) => context.run.next === 'moving', target: 'moving' },
        { guard: ({ context }) => context.run.next === 'standing', target: 'standing' },
        { guard: ({ context }) => context.run.next === 'awaiting', target: 'awaiting' },
        { guard: ({ context }) => context.run.next === 'finished', target: 'finished' },
        { guard: ({ context }) => context.run.next === 'holding', target: 'holding', actions: act(beginHold) },
        { guard: ({ context }) => context.run.next === 'stopping', target: 'stopping', actions: act(beginStop) },
        { target: 'failed' },
      ],
    },
    homing: {
      on: {
        ...underWay,
        'link.motion-began': [{ guard: isMine, actions: act(noteBegan, expectEnd) }, strangeMotion],
        'link.homed': [
          {
            guard: (told) => isMine(told) && when(slipFoundHoming, noteEnded)(told),
            target: 'holding',
            actions: act(noteEnded, finishMotion, beginHold),
          },
          { guard: isMine, target: 'choosing', actions: act(noteEnded, finishMotion, chooseNext) },
        ],
        'link.home-failed': { guard: isMine, target: 'failed', actions: act(explainHomeFailure) },
        /** `done` is followed by `homed`, which carries the angle. */
        'link.motion-ended': motionEnds.slice(1),
        'link.refused': refusals(isMine, askAgain),
        deadline: fails('no-answer', 'Homing took longer than the whole travel allows; the controller never said that it ended.'),
      },
    },
    moving: {
      on: {
        ...underWay,
        'link.motion-began': [{ guard: isMine, actions: act(noteBegan, expectEnd) }, strangeMotion],
        'link.motion-ended': motionEnds,
        'link.refused': refusals(isMine, askAgain),
        deadline: holdsFor('no-answer', 'The move was sent, and the controller never said that it ended.'),
      },
    },
    standing: {
      on: {
        ...underWay,
        skip: skips,
        'link.motion-began': [
          { guard: (told) => isAhead(told) && !isCancelled(told), target: 'moving', actions: act(takeAhead, expectEnd) },
          { guard: isAhead, target: 'holding', actions: act(takeAhead, beginHold) },
          strangeMotion,
        ],
        'link.motion-ended': [
          // Its beginning was never told: the ring of events had gone on before it could be read again.
          { guard: endedAhead, target: 'choosing', actions: act(takeAhead, noteEnded, finishMotion, chooseNext) },
          { guard: isAhead, actions: act(dropAhead) },
        ],
        'link.refused': refusals(isAhead, dropAhead),
        looked: { actions: act(noteDwellLook) },
        deadline: [
          { guard: isOverdue, ...holdsFor('no-answer', 'The controller accepted the move and never told that it began.') },
          { guard: (told) => isOver(told) && mayMoveAgainst(told), target: 'holding', actions: act(explainHoldAfterStep, beginHold) },
          { guard: isOver, target: 'choosing', actions: act(endStanding, chooseNext) },
          { guard: when(lookIsDue), actions: act(lookBeforeEnd) },
          { actions: act(sendAhead) },
        ],
      },
    },
    /** Until it is calm, until a channel is quiet, until a person has confirmed. */
    awaiting: {
      on: {
        ...underWay,
        skip: skips,
        'link.motion-began': strangeMotion,
        'link.interlock': [{ guard: when(isPrompt), actions: act(noteDoor) }, ...underWay['link.interlock']],
        looked: [{ guard: when(isMet), target: 'choosing', actions: act(endMet, chooseNext) }, { actions: act(noteLook) }],
        'confirm-prompt': [
          { guard: when((draft) => confirmRefusal(draft) === null), target: 'choosing', actions: act(confirmPrompt, chooseNext) },
          { actions: act(refuseConfirm) },
        ],
        deadline: [
          {
            guard: when((draft) => givesUp(draft) && policyOfWait(draft) === 'continue'),
            target: 'choosing',
            actions: act(endGivenUp, chooseNext),
          },
          {
            guard: when((draft) => givesUp(draft) && policyOfWait(draft) === 'stop'),
            target: 'stopping',
            actions: act(endGivenUp, beginStop),
          },
          { guard: when(givesUp), target: 'holding', actions: act(endGivenUp, beginHold) },
          { guard: when(isPrompt), target: 'choosing', actions: act(confirmByItself, chooseNext) },
          { actions: act(lookForEnd) },
        ],
      },
    },
    /** Under `resume`: waiting for the line, then for standstill. */
    interrupted: {
      on: {
        ...underWay,
        ...pick(comingToRest, 'link.motion-began', 'link.motion-ended', 'link.homed', 'link.refused-controller'),
        'link.ready': [...returns, { actions: act(noteReady, awaitReturn) }],
        'link.standstill': [
          // Told on a line that is only just coming back, or while the database is away: what counts is the standstill after that.
          {
            guard: ({ context: { run } }) => !run.linkUp || run.databaseAwaySinceUtcMs !== null,
            actions: act(noteStandstill),
          },
          {
            guard: when((draft) => returnRefusal(draft) === null, noteStandstill, takeAheadUnseen),
            target: 'choosing',
            actions: act(noteStandstill, takeAheadUnseen, carryOn),
          },
          { target: 'holding', actions: act(noteStandstill, explainNoReturn, beginHold) },
        ],
        'database-back': { actions: act(noteDatabaseBack, awaitReturn) },
        deadline: { target: 'holding', actions: act(explainNoReturn, beginHold) },
      },
    },
    holding: {
      on: {
        ...comingToRest,
        hold: { actions: act(requestHold) },
        stop: { target: 'stopping', actions: act(requestStop) },
        ...refusedAtRest,
        ...finishes,
        resume: { actions: act((draft) => draft.log('resume-refused', { why: 'the run is still coming to rest' })) },
        'link.standstill': { target: 'held', actions: act(noteStandstill) },
        'link.reset': { target: 'held', actions: act(noteReset) },
        'link.ready': [{ guard: bootedAnew, target: 'held', actions: act(noteReset, noteReady) }, { actions: act(noteReady, beginHold) }],
        'server-restarted': { actions: act(noteRestart) },
        deadline: { target: 'held' },
      },
    },
    held: {
      entry: act(becomeHeld),
      on: {
        ...heard,
        resume: [
          { guard: when((draft) => resumeRefusal(draft) === null), target: 'choosing', actions: act(resume) },
          { actions: act(noteRefusedResume) },
        ],
        ...refusedAtRest,
        ...finishes,
        skip: skips,
        stop: { target: 'stopping', actions: act(requestStop) },
        'link.motion-began': { actions: act(noteStrangeMotion, (draft) => void draft.command((id) => ({ kind: 'hold', id }))) },
        ...pick(comingToRest, 'link.lost', 'link.refused-controller', 'link.interlock', 'link.supply', 'database-away', 'database-back'),
        'link.ready': [{ guard: bootedAnew, actions: act(noteReset, noteReady) }, { actions: act(noteReady) }],
        'link.reset': { actions: act(noteReset) },
        'server-restarted': { actions: act(noteRestart) },
      },
    },
    stopping: {
      on: {
        ...comingToRest,
        ...refusedAtRest,
        stop: { actions: act(requestStop) },
        'link.standstill': { target: 'stopped', actions: act(noteStandstill) },
        'link.reset': { target: 'stopped', actions: act(noteReset) },
        'link.ready': [
          { guard: bootedAnew, target: 'stopped', actions: act(noteReset, noteReady) },
          { actions: act(noteReady, beginStop) },
        ],
        'server-restarted': { actions: act(noteRestart) },
        deadline: { target: 'stopped' },
      },
    },
    stopped: { entry: act(becomeStopped) },
    finished: { entry: act(becomeFinished) },
    failed: { entry: act(becomeFailed) },
  },
});

const snapshotOf = (state: unknown, context: RunContext): RunSnapshot => ({ version: CHART_VERSION, state: state as ChartState, context });

/** A run before anything has happened, at the server's time `nowUtcMs`. */
export function beginRun(start: RunStart, nowUtcMs: number): RunSnapshot {
  const [state] = initialTransition(machine, { start, nowUtcMs });
  return snapshotOf(state.value, state.context.run);
}

/** One event, pure: the same snapshot and event always give the same result. */
export function advance(start: RunStart, snapshot: RunSnapshot, event: RunEvent): Advance {
  if (event.type === 'deadline' && !isDue(snapshot, event.at.utcMs)) return { snapshot, steps: [], events: [], effects: [] };
  const from = machine.resolveState({ value: snapshot.state, context: { start, run: snapshot.context, out: nothingOut } });
  const [next] = transition(machine, from, event);
  const { steps, events, effects } = next.context.out;
  return { snapshot: snapshotOf(next.value, next.context.run), steps, events, effects };
}

/** UTC ms at which the driver is to send `deadline`; null: nothing is awaited by time. */
export const deadlineOf = (snapshot: RunSnapshot): number | null => snapshot.context.deadlineUtcMs;

/** A deadline that was overtaken by another event means nothing any more. */
const isDue = ({ context }: RunSnapshot, utcMs: number) => context.deadlineUtcMs !== null && utcMs >= context.deadlineUtcMs - 0.5;

const over: readonly ChartState[] = ['stopped', 'finished', 'failed'];
export const isRunOver = (snapshot: RunSnapshot): boolean => over.includes(snapshot.state);

const atRest: readonly ChartState[] = ['holding', 'held', 'stopping', ...over];
/** Neither over nor brought to rest by a hold or a stop. */
export const isUnderWay = (snapshot: RunSnapshot): boolean => !atRest.includes(snapshot.state);

/** Whether an arm must stand at this time: a run on a rig, before the end of its arm, which nothing has made void yet. */
export const isArmExpected = (start: RunStart, { context }: RunSnapshot, utcMs: number): boolean =>
  start.simulated === null && context.arm !== null && context.armVoid === null && context.arm.untilUtcMs > utcMs;

/** States in which the controller may move the sources: only in these is the motion lease renewed. */
export const wantsMotion = ({ state, context }: RunSnapshot): boolean =>
  state === 'homing' || state === 'moving' || (state === 'standing' && context.ahead !== null && !context.ahead.cancelled);
