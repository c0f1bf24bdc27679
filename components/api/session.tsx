import { useQueryClient } from '@tanstack/react-query';
import { createContext, useContext, useEffect, useMemo, useReducer, useRef, useState, type ReactNode } from 'react';
import { getMe, signOut as signOutRoute, type Me, type MembershipView } from '@/shared/contracts/people';
import { may, type Act } from '@/shared/contracts/roles';
import { call, onSignInRefused } from './client';
import { ApiProblem } from './problem';
import { membershipOf, sessionReducer, type SessionState } from './session-reducer';

const labKey = 'evenfall.lab';

function rememberedLabId(): string | null {
  try {
    return window.localStorage.getItem(labKey);
  } catch {
    return null;
  }
}

function rememberLabId(labId: string): void {
  try {
    window.localStorage.setItem(labKey, labId);
  } catch {
    return;
  }
}

interface SessionApi {
  state: SessionState;
  /** Why the server could not say yet who is signed in; it is asked again. */
  problem: unknown;
  membership: MembershipView | null;
  signedIn: (me: Me) => void;
  signOut: () => Promise<void>;
  /** Reads again who is signed in: names, roles and time zones may have changed. */
  refresh: () => Promise<void>;
  chooseLab: (labId: string) => void;
}

const SessionContext = createContext<SessionApi | null>(null);

/** The session and what changes it. */
export function useSession(): SessionApi {
  const session = useContext(SessionContext);
  if (session === null) throw new Error('useSession needs a SessionProvider above it');
  return session;
}

const askAgainMs = 3000;

/** Asks once who is signed in; a server that does not answer is asked again. */
function useAsk(ask: boolean, answered: (me: Me | null) => void, failed: (error: unknown) => void) {
  useEffect(() => {
    if (!ask) return undefined;
    let timer: ReturnType<typeof setTimeout> | undefined;
    let over = false;
    const attempt = () => {
      call(getMe).then(
        ({ data }) => (over ? undefined : answered(data)),
        (error: unknown) => {
          if (over) return;
          if (error instanceof ApiProblem && error.status === 401) answered(null);
          else {
            failed(error);
            timer = setTimeout(attempt, askAgainMs);
          }
        },
      );
    };
    attempt();
    return () => {
      over = true;
      clearTimeout(timer);
    };
  }, [ask, answered, failed]);
}

/** Holds the session of this page. */
export function SessionProvider({ children }: { children: ReactNode }) {
  const queries = useQueryClient();
  const [state, dispatch] = useReducer(sessionReducer, { kind: 'unknown' });
  const answered = useMemo(() => (me: Me | null) => dispatch({ kind: 'asked', me, rememberedLabId: rememberedLabId() }), []);
  const [problem, failed] = useState<unknown>(null);
  useAsk(state.kind === 'unknown', answered, failed);
  useEffect(() => onSignInRefused(() => dispatch({ kind: 'refused' })), []);

  const api = useMemo<SessionApi>(
    () => ({
      state,
      problem: state.kind === 'unknown' ? problem : null,
      membership: membershipOf(state),
      signedIn: (me) => {
        const samePerson = state.kind === 'expired' && state.me.user.id === me.user.id;
        dispatch({ kind: 'signed-in', me, rememberedLabId: rememberedLabId() });
        if (samePerson) void queries.invalidateQueries();
        else queries.clear();
      },
      signOut: async () => {
        await call(signOutRoute);
        dispatch({ kind: 'signed-out' });
        queries.clear();
      },
      refresh: async () => {
        const labId = state.kind === 'signed-in' ? state.labId : null;
        const asked = await call(getMe).catch(() => null);
        if (asked !== null) dispatch({ kind: 'asked', me: asked.data, rememberedLabId: labId ?? rememberedLabId() });
      },
      chooseLab: (labId) => {
        rememberLabId(labId);
        dispatch({ kind: 'lab-chosen', labId });
      },
    }),
    [state, problem, queries],
  );
  useRefreshWhenSeen(api);
  return <SessionContext.Provider value={api}>{children}</SessionContext.Provider>;
}

/** A page that comes back into view after a while may show a role or a zone of yesterday. */
function useRefreshWhenSeen({ state, refresh }: SessionApi) {
  const signedIn = state.kind === 'signed-in';
  const latest = useRef(refresh);
  useEffect(() => {
    latest.current = refresh;
  });
  useEffect(() => {
    if (!signedIn) return undefined;
    const onSeen = () => (document.visibilityState === 'visible' ? void latest.current() : undefined);
    document.addEventListener('visibilitychange', onSeen);
    return () => document.removeEventListener('visibilitychange', onSeen);
  }, [signedIn]);
}

/** The lab in which this page works. Only below the signed-in part of the application. */
export function useLab(): MembershipView {
  const { membership } = useSession();
  if (membership === null) throw new Error('useLab needs a signed-in member of a lab');
  return membership;
}

const rolesInWords: Record<Act, string> = {
  'members.manage': 'Only an owner may manage members.',
  'lab.settings': 'Only an owner may change the settings of the lab.',
  'tokens.manage': 'Only an owner may make and revoke device tokens, and add and remove brokers.',
  'rig.edit': 'Only a keeper or an owner may change a rig.',
  'rig.arm': 'Only an operator, a keeper or an owner may arm a rig.',
  'cautions.sign': 'Only an operator, a keeper or an owner signs the cautions of a rig.',
  'lock.own': 'Only an operator, a keeper or an owner sets a personal lock.',
  'lock.override': 'Only an owner may lift the personal lock of somebody else.',
  'protocol.write': 'Only an operator, a keeper or an owner may write and issue protocols.',
  'run.start': 'Only an operator, a keeper or an owner may start a run.',
  'run.resume': 'Only an operator, a keeper or an owner may resume a run.',
  'prompt.confirm': 'Only an operator, a keeper or an owner may confirm a prompt.',
  'run.hold': 'Every member may hold a run.',
  'run.stop': 'Every member may stop a run.',
  'alarm.acknowledge': 'Only an analyst, an operator, a keeper or an owner may acknowledge an alarm.',
  'alarm.shelve': 'Only an operator, a keeper or an owner may shelve or reset an alarm.',
  'data.import': 'Only an analyst, an operator, a keeper or an owner may import data.',
  'data.annotate': 'Only an analyst, an operator, a keeper or an owner may write notes to the step log.',
  'data.exclude': 'Only an analyst, an operator, a keeper or an owner may exclude data.',
  'data.retention': 'Only a keeper or an owner may decide how long samples are kept.',
  evaluate: 'Only an analyst, an operator, a keeper or an owner may evaluate a run.',
  read: 'Every member may read.',
};

/** Whether the signed-in member may do `act`, and the sentence that says who may. */
export function useMay(act: Act): { ok: boolean; why: string } {
  const { role } = useLab();
  return {
    ok: may(role, act),
    why: `${rolesInWords[act]} You are ${role === 'owner' || role === 'operator' || role === 'analyst' ? 'an' : 'a'} ${role}.`,
  };
}
