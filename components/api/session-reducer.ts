import type { Me, MembershipView } from '@/shared/contracts/people';

/** Who sits before this page. `expired`: was signed in here and may sign in again over the page without losing it. */
export type SessionState =
  | { kind: 'unknown' }
  | { kind: 'signed-out' }
  | { kind: 'signed-in'; me: Me; labId: string | null }
  | { kind: 'expired'; me: Me; labId: string | null };

export type SessionEvent =
  | { kind: 'asked'; me: Me | null; rememberedLabId: string | null }
  | { kind: 'signed-in'; me: Me; rememberedLabId: string | null }
  | { kind: 'refused' }
  | { kind: 'signed-out' }
  | { kind: 'lab-chosen'; labId: string };

const labOf = (me: Me, wanted: string | null): string | null =>
  me.memberships.find((membership) => membership.labId === wanted)?.labId ?? me.memberships[0]?.labId ?? null;

const signedIn = (me: Me, wanted: string | null): SessionState => ({ kind: 'signed-in', me, labId: labOf(me, wanted) });

/** The session as a pure function of what happened. */
export function sessionReducer(state: SessionState, event: SessionEvent): SessionState {
  switch (event.kind) {
    case 'asked':
      return event.me === null ? { kind: 'signed-out' } : signedIn(event.me, event.rememberedLabId);
    case 'signed-in':
      return signedIn(event.me, state.kind === 'expired' ? state.labId : event.rememberedLabId);
    case 'refused':
      return state.kind === 'signed-in' ? { ...state, kind: 'expired' } : state.kind === 'unknown' ? { kind: 'signed-out' } : state;
    case 'signed-out':
      return { kind: 'signed-out' };
    case 'lab-chosen':
      return state.kind === 'signed-in' ? { ...state, labId: labOf(state.me, event.labId) } : state;
  }
}

/** The membership in the chosen lab, or null where there is none. */
export function membershipOf(state: SessionState): MembershipView | null {
  if (state.kind !== 'signed-in' && state.kind !== 'expired') return null;
  return state.me.memberships.find((membership) => membership.labId === state.labId) ?? null;
}
