import type { Draft } from './draft';
import { predictEndUtcMs } from './predicted-end';
import type { Finishing, RunContext } from './run-context';

/** A run that ends before the end of its protocol: the pass under way is made whole, no other begins, and what follows the repeats is carried out. */

const iso = (utcMs: number) => new Date(utcMs).toISOString();

/** Who asked, as the log and the screens say it. */
export const askedBy = ({ by, finishByUtcMs }: Pick<Finishing, 'by' | 'finishByUtcMs'>): string => {
  if (by !== '') return by;
  return finishByUtcMs === null ? 'few good dwells' : 'the night window';
};

/** In force now. */
export const isFinishing = ({ finishing }: Pick<RunContext, 'finishing'>): boolean =>
  finishing !== undefined && finishing.withdrawnBy === null;

/** Tells the cursor; not while a move waits in the controller, which is the next one of the plan under which it was sent. */
export function heedFinishing(context: Pick<RunContext, 'finishing' | 'cursor' | 'ahead'>): void {
  const { finishing, cursor, ahead } = context;
  if (ahead !== null) return;
  if (finishing !== undefined && finishing.withdrawnBy === null) cursor.finishByUtcMs = finishing.finishByUtcMs ?? 0;
  else delete cursor.finishByUtcMs;
}

/** Why it is not to end early; null where it is. */
export function finishRefusal(draft: Draft): string | null {
  const { context, start, nowUtcMs } = draft;
  const { by, finishByUtcMs } = draft.told('finish-early');
  const { finishing } = context;
  if (finishing !== undefined && finishing.withdrawnBy === null && finishing.finishByUtcMs === finishByUtcMs)
    return `The run is to end early already: ${askedBy(finishing)} asked for it.`;
  // What is in force for the night window gives way to the few good dwells, which end the run sooner.
  const sooner = finishing?.by === '' && finishing.withdrawnBy === null && finishByUtcMs === null;
  if (by === '' && finishing !== undefined && !sooner) return 'Somebody has decided about the end of this run already.';
  const endUtcMs = (cursor: RunContext['cursor']) => predictEndUtcMs(start, { ...context, cursor }, { nowUtcMs });
  const whole = { ...context.cursor };
  delete whole.finishByUtcMs;
  const early = endUtcMs({ ...whole, finishByUtcMs: finishByUtcMs ?? 0 });
  if (early >= endUtcMs(whole)) return 'Nothing would be left out: the pair under way is the last one of this run in any case.';
  return finishByUtcMs !== null && early > finishByUtcMs ? `Not even the pair under way would be over by ${iso(finishByUtcMs)}.` : null;
}

export function finishEarly(draft: Draft): void {
  const { by, finishByUtcMs } = draft.told('finish-early');
  const { context, nowUtcMs } = draft;
  context.finishing = { by, askedUtcMs: nowUtcMs, finishByUtcMs, withdrawnBy: null };
  heedFinishing(context);
  draft.log('finish-asked', { by: askedBy({ by, finishByUtcMs }), ...(finishByUtcMs === null ? {} : { overBy: iso(finishByUtcMs) }) });
}

export const refuseFinish = (draft: Draft): void =>
  draft.log('finish-early-refused', { by: askedBy(draft.told('finish-early')), why: finishRefusal(draft) });

export function withdrawFinish(draft: Draft): void {
  const { by } = draft.told('withdraw-finish');
  const { context } = draft;
  if (context.finishing === undefined) return;
  draft.log('finish-withdrawn', { by, askedBy: askedBy(context.finishing) });
  context.finishing = { ...context.finishing, withdrawnBy: by };
  heedFinishing(context);
}

export const refuseWithdrawFinish = (draft: Draft): void =>
  draft.log('withdraw-finish-refused', {
    by: draft.told('withdraw-finish').by,
    why: 'The run goes on to the end of its protocol already. Look at it again.',
  });

/** `, on a whole pair as Ben asked`; empty for a run that ends as its protocol says. */
export function finishedWords({ finishing }: Pick<RunContext, 'finishing'>, endUtcMs: number): string {
  if (finishing === undefined || finishing.withdrawnBy !== null) return '';
  const late = finishing.finishByUtcMs !== null && endUtcMs > finishing.finishByUtcMs;
  if (finishing.by === '' && finishing.finishByUtcMs === null) return ', on a whole pair, for few of its dwells were good';
  if (finishing.by === '')
    return late ? ', on a whole pair, after the end of the night window' : ', on a whole pair before the end of the night window';
  return `, on a whole pair as ${finishing.by} asked`;
}
