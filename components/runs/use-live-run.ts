import { useCallback, useEffect, useReducer, useRef } from 'react';
import { addressOf, call, deviceNowMs, isProblem, useLab } from '@/components/api';
import { getRun, listSteps, liveRun } from '@/shared/contracts/runs';
import { isOver } from './run-words';
import { openLiveStream } from './live-stream';
import { liveReducer, noLive, type LiveMessage, type LiveState } from './live-reducer';

const flushMs = 200;
const silentMs = 5000;
const pollMs = 2000;

export interface LiveRun {
  state: LiveState;
  /** Why the run could not be loaded at all; null once it is there. */
  error: unknown;
  /** Asks for the whole again. */
  refresh: () => void;
}

/**
 * A run as it happens: the stream for what is new, the ordinary routes for what came before, for gaps, and every 2 s
 * while the stream is silent, so that a confirmation is not missed behind a proxy that swallows streams.
 */
export function useLiveRun(runId: string): LiveRun {
  const { labId } = useLab();
  const [state, dispatch] = useReducer(liveReducer, noLive);
  const [error, setError] = useReducer((_: unknown, next: unknown) => next, null);
  const waiting = useRef<LiveMessage[]>([]);
  const on = state.view === null || !isOver(state.view.state);

  const refresh = useCallback(async () => {
    try {
      const params = { labId, runId };
      // Without its database the server knows the run it drives, but not its log.
      const log = call(listSteps, { params }).then(
        ({ data }) => data.items,
        (problem: unknown) => {
          if (!isProblem(problem, 'database-away')) throw problem;
          return [];
        },
      );
      const [view, rows] = await Promise.all([call(getRun, { params }), log]);
      dispatch({ kind: 'loaded', view: view.data, rows });
      setError(null);
    } catch (problem) {
      setError(problem);
    }
  }, [labId, runId]);

  useEffect(() => void refresh(), [refresh]);

  useEffect(() => {
    if (!on) return undefined;
    const flush = () => {
      if (waiting.current.length === 0) return;
      dispatch({ kind: 'messages', messages: waiting.current });
      waiting.current = [];
    };
    const timer = setInterval(flush, flushMs);
    const close = openLiveStream(addressOf(liveRun, { params: { labId, runId } }), {
      onMessage: (message) => waiting.current.push(message),
      onOpen: () => dispatch({ kind: 'opened' }),
      onBroken: () => dispatch({ kind: 'broken' }),
    });
    return () => {
      clearInterval(timer);
      close();
    };
  }, [labId, runId, on]);

  const heardAt = useRef<number | null>(null);
  useEffect(() => {
    heardAt.current = state.heardAtMs;
  }, [state.heardAtMs]);
  useEffect(() => {
    if (!on) return undefined;
    const timer = setInterval(() => {
      if (heardAt.current === null || deviceNowMs() - heardAt.current > silentMs) void refresh();
    }, pollMs);
    return () => clearInterval(timer);
  }, [on, refresh]);

  useEffect(() => {
    if (state.missed) void refresh();
  }, [state.missed, refresh]);

  const again = useCallback(() => void refresh(), [refresh]);
  return { state, error, refresh: again };
}
