import { useEffect, useRef, useState } from 'react';
import { call, serverNowIso, useLab, useLabMutation, useSession, wordsOf } from '@/components/api';
import {
  beginGuided,
  endGuided,
  homeByHand,
  nudge,
  stayGuided,
  teachLimits,
  type GuidedView,
  type LineMessage,
} from '@/shared/contracts/link';
import type { LiveLine } from './use-live-line';

export interface GuidedMove {
  /** The guided move that this person began; null while there is none. */
  mine: GuidedView | null;
  /** Somebody else's name while they are at it. */
  other: string | null;
  /** Nothing may be ordered: why. Empty while something may. */
  whyNot: string;
  busy: boolean;
  /** What the last order was refused with. */
  problem: { detail: string } | null;
  begin: () => void;
  end: () => void;
  nudge: (steps: number, intoKeepOut: boolean) => void;
  home: (intoKeepOut: boolean) => void;
  teach: (etag: string | undefined) => void;
}

/** Answers each beat of the stream while the page is seen: a page that nobody looks at moves nothing. */
function useStaying(rigId: string, line: LineMessage | null, guidedId: string | null): void {
  const { labId } = useLab();
  const answered = useRef(-1);
  const beat = line?.beat ?? null;
  useEffect(() => {
    if (guidedId === null || beat === null || beat <= answered.current || document.visibilityState === 'hidden') return;
    answered.current = beat;
    // A missed answer is made up for by the next beat, half a second later.
    call(stayGuided, { params: { labId, rigId }, body: { guidedId, beat } }).catch(() => undefined);
  }, [labId, rigId, guidedId, beat]);
}

/** Ends the guided move when the page is left. */
function useEndOnLeaving(rigId: string, guidedId: string | null): void {
  const { labId } = useLab();
  const open = useRef(guidedId);
  useEffect(() => {
    open.current = guidedId;
  }, [guidedId]);
  useEffect(() => {
    const end = () => {
      if (open.current === null) return;
      call(endGuided, { params: { labId, rigId }, body: { guidedId: open.current }, keepalive: true }).catch(() => undefined);
      open.current = null;
    };
    window.addEventListener('pagehide', end);
    return () => {
      window.removeEventListener('pagehide', end);
      end();
    };
  }, [labId, rigId]);
}

/** A guided first move from this page: what may be ordered, and the orders. */
export function useGuided(rigId: string, { line, broken }: LiveLine): GuidedMove {
  const { state } = useSession();
  const userId = state.kind === 'signed-in' ? state.me.user.id : null;
  const [ended, setEnded] = useState<string | null>(null);
  const guided = line?.guided ?? null;
  const mine = guided !== null && guided.by.id === userId && guided.id !== ended ? guided : null;
  const guidedId = mine?.id ?? null;
  useStaying(rigId, line, guidedId);
  useEndOnLeaving(rigId, guidedId);
  const beginning = useLabMutation(beginGuided);
  const ending = useLabMutation(endGuided);
  const nudging = useLabMutation(nudge);
  const homing = useLabMutation(homeByHand);
  const teaching = useLabMutation(teachLimits);
  const params = { rigId };
  const orders = [nudging, homing, teaching];
  const failure = [beginning, ...orders].find(({ error }) => error !== null)?.error ?? null;
  const forget = () => [beginning, ...orders].forEach((mutation) => mutation.reset());
  const give = (send: (body: { guidedId: string; tappedAt: string }) => void) => {
    if (guidedId === null) return;
    forget();
    send({ guidedId, tappedAt: serverNowIso() });
  };
  return {
    mine,
    other: guided !== null && guided.by.id !== userId ? guided.by.name : null,
    whyNot: broken ? 'The page has lost the server. Nothing is set in motion until it is back.' : (mine?.whyNot ?? ''),
    busy: [beginning, ending, ...orders].some(({ isPending }) => isPending),
    problem: failure === null ? null : wordsOf(failure),
    begin: () => {
      forget();
      beginning.mutate({ params, body: { atTheRig: true } });
    },
    end: () => {
      if (guidedId === null) return;
      setEnded(guidedId);
      ending.mutate({ params, body: { guidedId } });
    },
    nudge: (steps, intoKeepOut) => give((body) => nudging.mutate({ params, body: { ...body, steps, intoKeepOut } })),
    home: (intoKeepOut) => give((body) => homing.mutate({ params, body: { ...body, intoKeepOut } })),
    teach: (etag) => give((body) => teaching.mutate({ params, ifMatch: etag, body })),
  };
}
