import { known } from './beginning';
import type { Draft } from './draft';
import type { ControllerState } from '../interfaces/turntable-link';
import type { RunContext } from './run-context';
import { noteGrave } from './halting';
import { forgetPosition } from './position';

/** What the controller and its line tell, written into the context and the log. Nothing is decided here. */

export function noteReady(draft: Draft): void {
  const { link } = draft.told('link.ready');
  const { context } = draft;
  const { controller } = link;
  const { linkDownSinceUtcMs } = context;
  const unseen = unseenCause(context, controller);
  context.controller = known(controller);
  context.linkUp = true;
  context.linkDownSinceUtcMs = null;
  context.uPlanS = draft.stamp.uS;
  if (!controller.positionKnown) forgetPosition(draft);
  const gapS = linkDownSinceUtcMs === null ? 0 : Math.max(0, (draft.nowUtcMs - linkDownSinceUtcMs) / 1000);
  draft.log('link-ready', { bootId: controller.bootId, firmware: controller.firmware, gapS });
  if (unseen === null) return;
  draft.log(unseen, { [unseen === 'interlock' ? 'closed' : 'present']: false, unseen: true });
  noteGrave(draft, unseen);
}

/**
 * What happened at the rig while nobody listened, whatever the inputs are now. An interlock that was opened leaves a warning due before the
 * next motion; a supply that was lost takes the position with it, as nothing else does but homing and a restart of the controller.
 */
export function unseenCause({ controller: before, step }: RunContext, now: ControllerState): 'interlock' | 'supply' | null {
  if (before === null || before.bootId !== now.bootId) return null;
  if (before.interlockClosed && (!now.interlockClosed || (before.warningDue !== true && now.warningDue))) return 'interlock';
  const positionLost = before.positionKnown && !now.positionKnown && step?.row.kind !== 'home';
  return before.supplyPresent && (!now.supplyPresent || positionLost) ? 'supply' : null;
}

/** Whether the controller that answers has restarted since it was last heard. */
export function hasRestarted(context: RunContext, bootId: string): boolean {
  return context.controller !== null && context.controller.bootId !== bootId;
}

export function noteLost(draft: Draft): void {
  const { link } = draft.told('link.lost');
  draft.context.linkUp = false;
  draft.context.linkDownSinceUtcMs ??= draft.stamp.utcMs;
  draft.log('link-lost', { why: link.why });
}

/** What answers is not the controller: another device, another server's, or noise. The link goes on trying. */
export function noteStranger(draft: Draft): void {
  const { link } = draft.told('link.refused-controller');
  draft.context.linkUp = false;
  draft.context.linkDownSinceUtcMs ??= draft.stamp.utcMs;
  draft.log('controller-refused', { why: link.why });
}

/** The position is gone; whatever moved is over. */
export function noteReset(draft: Draft): void {
  const { event, context } = draft;
  const bootId = event.type === 'link.ready' ? event.link.controller.bootId : draft.told('link.reset').link.bootId;
  if (context.controller !== null)
    Object.assign(context.controller, { bootId, positionKnown: false, angleDeg: null, moving: false, warningDue: true });
  forgetPosition(draft);
  draft.log('controller-reset', { bootId });
  noteGrave(draft, 'controller-reset');
}

export function noteInterlock(draft: Draft): void {
  const { link } = draft.told('link.interlock');
  const { closed } = link;
  const { controller } = draft.context;
  if (controller !== null) Object.assign(controller, { interlockClosed: closed, warningDue: closed ? controller.warningDue : true });
  draft.log('interlock', { closed });
  if (!closed) noteGrave(draft, 'interlock');
}

export function noteSupply(draft: Draft): void {
  const { link } = draft.told('link.supply');
  const { present } = link;
  const { controller } = draft.context;
  if (controller !== null) controller.supplyPresent = present;
  if (controller !== null && !present) Object.assign(controller, { positionKnown: false, angleDeg: null });
  if (!present) forgetPosition(draft);
  draft.log('supply', { present });
  if (!present) noteGrave(draft, 'supply');
}

/** The arm was ended: nothing of this run may move any more. */
export function noteArmEnded(draft: Draft): void {
  const { context } = draft;
  const { why } = draft.told('arm-ended');
  const { name = 'the rig' } = context.arm ?? {};
  draft.log('arm-ended', { name, why });
  draft.because('arm-ended', `The arm of ${name} was ended${why === '' ? '' : `: ${why}`}. Arm the rig again on site, then resume.`);
  context.armVoid = why === '' ? 'it was ended' : why;
}

export function noteArmKey(draft: Draft): void {
  draft.log('arm-key', { on: draft.told('link.arm-key').link.on });
}

/** Of the controller's clock, stamps before and after are not to be subtracted without a look. Where the server's is set ahead, the arm does not last longer for it. */
export function noteClock(draft: Draft): void {
  const { context } = draft;
  const { clock, byMs } = draft.told('link.clock-stepped').link;
  draft.log('clock-stepped', { clock, byMs });
  if (clock === 'host' && byMs > 0 && context.arm !== null) context.arm = { ...context.arm, untilUtcMs: context.arm.untilUtcMs - byMs };
}

export function noteLease(draft: Draft): void {
  draft.log('lease-lapsed');
}

export function noteStandstill(draft: Draft): void {
  const { link } = draft.told('link.standstill');
  const { angleDeg } = link;
  if (angleDeg === null) forgetPosition(draft);
  if (draft.context.controller !== null)
    Object.assign(draft.context.controller, { moving: false, angleDeg, positionKnown: angleDeg !== null });
}

export function noteRefusal(draft: Draft): void {
  const { link } = draft.told('link.refused');
  const { commandId, code, message } = link;
  draft.log('command-refused', { commandId, code, message });
}

/** The turntable moves and this run did not ask for it. */
export function noteStrangeMotion(draft: Draft): void {
  const { link } = draft.told('link.motion-began');
  const { commandId, angleDeg } = link;
  draft.log('unexpected-motion', { commandId, angleDeg });
  draft.because(
    'unexpected-motion',
    'The turntable moved without a command of this run. Somebody has to look at the rig before it moves again.',
  );
}
