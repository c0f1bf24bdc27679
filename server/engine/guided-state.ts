import type { RigMotion } from '@/shared/rig/document';
import type { EdgePass } from '@/shared/rig/steps-per-degree';
import type { LinkEvent, MotionEndCause } from '../interfaces/turntable-link';

/** What a guided first move knows of the turntable: a pure function of what was ordered and what the link told. */

export type GuidedOrderState = 'sent' | 'accepted' | 'moving' | 'done' | 'cut short' | 'refused';

export interface GuidedOrder {
  id: string;
  sentAtUtcMs: number;
  kind: 'nudge' | 'home';
  /** Microsteps of a nudge, positive counter-clockwise; null for home. */
  steps: number | null;
  state: GuidedOrderState;
  /** Why it was refused or cut short; empty while all is well. */
  detail: string;
}

export interface GuidedState {
  /** The newest order. */
  order: GuidedOrder | null;
  /**
   * Microsteps turned since the count began. Nobody knows how far a nudge went that was cut short while the position was unknown: then
   * the count begins anew under the next number.
   */
  count: { number: number; steps: number };
  /** Passes of the home flag's edge since the position became known, microsteps from home; the newest last. */
  edges: EdgePass[];
  /** Angle at which the motion that is going on began, deg. */
  fromDeg: number | null;
}

const mostEdges = 50;

export const beginGuided = (): GuidedState => ({ order: null, count: { number: 1, steps: 0 }, edges: [], fromDeg: null });

export const isUnderWay = ({ order }: GuidedState): boolean =>
  order !== null && (order.state === 'sent' || order.state === 'accepted' || order.state === 'moving');

export const withOrder = (state: GuidedState, order: Pick<GuidedOrder, 'id' | 'sentAtUtcMs' | 'kind' | 'steps'>): GuidedState => ({
  ...state,
  order: { ...order, state: 'sent', detail: '' },
  fromDeg: null,
});

const causeWords: Record<Exclude<MotionEndCause, 'done'>, string> = {
  hold: 'It was held.',
  stop: 'It was stopped. A stop ends the arm: arm the rig again before the next move.',
  interlock: 'The interlock was opened.',
  supply: 'The motor supply was lost, and with it the position.',
  lease: 'The motion lease lapsed: nobody was at the page, or the line failed.',
  limit: 'The controller met one of its limits.',
  reset: 'The controller restarted, and the position is lost.',
};

/** The state after something that the link told. */
export function heardGuided(state: GuidedState, event: LinkEvent, motion: RigMotion): GuidedState {
  switch (event.kind) {
    case 'edge': {
      if (event.angleDeg === null) return state;
      const steps = Math.round((event.angleDeg - motion.homeDeg) * motion.stepsPerDegree) + 0;
      return { ...state, edges: [...state.edges, { steps, direction: event.direction }].slice(-mostEdges) };
    }
    case 'reset':
      return lost(cutShort(state, causeWords.reset));
    case 'supply':
      return event.present ? state : lost(state);
    case 'lost':
      return isUnderWay(state) ? lost(cutShort(state, `The line failed meanwhile: ${event.why}`)) : state;
    default:
      return 'commandId' in event && event.commandId === state.order?.id ? heardOfOrder(state, event, motion) : state;
  }
}

function heardOfOrder(state: GuidedState, event: Extract<LinkEvent, { commandId: string }>, motion: RigMotion): GuidedState {
  const order = state.order as GuidedOrder;
  const put = (change: Partial<GuidedOrder>, rest: Partial<GuidedState> = {}): GuidedState => ({
    ...state,
    ...rest,
    order: { ...order, ...change },
  });
  switch (event.kind) {
    case 'accepted':
      return put({ state: 'accepted' });
    case 'refused':
      return put({ state: 'refused', detail: event.message });
    case 'motion-began':
      return put({ state: 'moving' }, { fromDeg: event.angleDeg });
    case 'homed':
      // The zero was met counter-clockwise, and counts from before do not go on from it.
      return put({ state: 'done' }, { ...lost(state), edges: [{ steps: 0, direction: 'ccw' }] });
    case 'home-failed':
      return put({ state: 'cut short', detail: event.message }, lost(state));
    case 'motion-ended': {
      if (event.cause === 'done') return put({ state: 'done' }, { count: counted(state, order.steps ?? 0) });
      const ended = put({ state: 'cut short', detail: causeWords[event.cause] });
      if (order.state !== 'moving') return ended;
      if (event.angleDeg === null || state.fromDeg === null || order.kind === 'home') return lost(ended);
      return { ...ended, count: counted(state, Math.round((event.angleDeg - state.fromDeg) * motion.stepsPerDegree)) };
    }
    case 'standstill':
      return state;
  }
}

const counted = ({ count }: GuidedState, steps: number) => ({ ...count, steps: count.steps + steps });

const cutShort = (state: GuidedState, detail: string): GuidedState =>
  isUnderWay(state) && state.order !== null ? { ...state, order: { ...state.order, state: 'cut short', detail } } : state;

const lost = (state: GuidedState): GuidedState => ({ ...state, count: { number: state.count.number + 1, steps: 0 }, edges: [] });
