import type { RunStart } from '@/shared/archive/run-records';
import { beginCursor } from '@/shared/protocol/cursor';
import type { Draft } from './draft';
import type { ControllerState } from '../interfaces/turntable-link';
import { noPair } from './pairs';
import type { KnownController, RunContext } from './run-context';
import { nothingKnown } from './position';
import { chooseNext } from './steps';
import { ANSWER_MS } from './timing';

/** A run before its first event. */
export function newContext(start: RunStart, nowUtcMs: number): RunContext {
  return {
    cursor: beginCursor(),
    rowCount: 0,
    commandCount: 0,
    dwellsDone: 0,
    dwellsGood: 0,
    dwells: [],
    judging: null,
    dwellJustNotGood: false,
    waiting: null,
    startedAtUtcMs: null,
    endedAtUtcMs: null,
    arm: start.arm,
    armVoid: null,
    controller: null,
    position: nothingKnown,
    linkUp: false,
    linkDownSinceUtcMs: null,
    databaseAwaySinceUtcMs: null,
    uPlanS: 0,
    step: null,
    ahead: null,
    moveRetries: 0,
    moment: { utcMs: nowUtcMs, uS: 0, angleDeg: start.rig.motion?.homeDeg ?? 0 },
    onCadence: false,
    swingStartUtcMs: null,
    swungFromDeg: null,
    heldForDwell: null,
    pair: noPair,
    holdAfterStep: null,
    intervention: null,
    interruption: null,
    haltedAtUtcMs: null,
    reason: null,
    deadlineUtcMs: nowUtcMs + ANSWER_MS,
    next: null,
  };
}

/** The part of the controller's state that the run keeps. */
export const known = (state: ControllerState): KnownController => ({
  bootId: state.bootId,
  positionKnown: state.positionKnown,
  angleDeg: state.angleDeg,
  moving: state.moving,
  interlockClosed: state.interlockClosed,
  supplyPresent: state.supplyPresent,
  warningDue: state.warningDue,
});

/** Takes down the controller that answers at the start. */
export function noteBeginning(draft: Draft): void {
  const { controller } = draft.told('begin');
  if (controller === null) return;
  draft.context.controller = known(controller);
  draft.context.linkUp = true;
}

/** Why a controller that answers cannot be driven now; null where it can. */
export function startRefusal({ context }: Draft): string | null {
  const { controller } = context;
  if (controller === null) return null;
  if (!controller.interlockClosed) return 'The interlock is open; close it, then start again.';
  if (!controller.supplyPresent) return 'The motor supply is off; switch it on at the rig, then start again.';
  if (controller.moving) return 'The turntable is already moving; wait until it stands still, then start again.';
  return null;
}

export function explainStartRefusal(draft: Draft): void {
  draft.because('not-ready', startRefusal(draft) ?? 'The rig was not ready.');
}

/** All is ready: the run has a beginning in time, and the first step begins. */
export function startRun(draft: Draft): void {
  const { context, start } = draft;
  context.startedAtUtcMs = draft.nowUtcMs;
  draft.standAt(draft.event.at, draft.controller.angleDeg ?? context.moment.angleDeg);
  draft.log(
    'run-started',
    {
      rig: start.rigName,
      rigRevision: start.rigRevision,
      protocol: start.protocolName,
      protocolRevision: start.protocolRevision,
      massSet: start.massSetLabel,
      operator: start.operator,
      arm: start.arm,
      onInterruption: start.protocol.onInterruption ?? 'hold',
      ...(start.shuffleSeed === undefined ? {} : { shuffleSeed: start.shuffleSeed }),
    },
    draft.event.at,
  );
  draft.notify('started', `${start.protocolName} started on ${start.rigName}.`);
  chooseNext(draft);
}
