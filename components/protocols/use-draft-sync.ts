import { useQueryClient } from '@tanstack/react-query';
import { useCallback, useEffect, useMemo, useReducer, useRef } from 'react';
import { ApiProblem, ApiUnreachable, isProblem, labKey, useConnection, useLab, useLabCall, useSession, wordsOf } from '@/components/api';
import { listProtocols, saveProtocol } from '@/shared/contracts/protocols';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { dropBackup, keepBackup } from './draft-backup';
import { oneAtATime } from './one-at-a-time';
import { beginSave, saveReducer, type SaveEvent, type SaveState } from './save-reducer';

const quietMs = 700;

export interface DraftSync {
  state: SaveState;
  /** Saves now if there is anything to save. The ETag of the saved draft, or null where it could not be saved. */
  flush: () => Promise<string | null>;
  /** Takes the server's draft as the base: the present document is then saved over it, or is it. */
  adopt: (etag: string, document: ProtocolDocument) => void;
  tryAgain: () => void;
  /** Whether the ETag belongs to a draft that came from here, or that this one began with. */
  isOwn: (etag: string) => boolean;
}

function failureOf(error: unknown): SaveEvent {
  const { detail, errors } = wordsOf(error);
  const all = [detail, ...errors.map(({ path, message }) => `${path} ${message}`.trim())].join(' ');
  if (isProblem(error, 'edited-meanwhile')) return { kind: 'failed', status: 'overtaken', detail };
  if (error instanceof ApiUnreachable) return { kind: 'failed', status: 'unreachable', detail };
  if (error instanceof ApiProblem && error.status === 401) return { kind: 'failed', status: 'signed-out', detail };
  return { kind: 'failed', status: 'refused', detail: all };
}

interface SyncInput {
  protocolId: string;
  document: ProtocolDocument;
  begin: { etag: string; document: ProtocolDocument };
  mayWrite: boolean;
}

/** Saves the draft shortly after each edit, never over somebody else's, and keeps it on the device until it has arrived. */
export function useDraftSync({ protocolId, document, begin, mayWrite }: SyncInput): DraftSync {
  const [state, dispatch] = useReducer(saveReducer, begin, ({ etag, document: saved }) => beginSave(etag, saved));
  const save = useSave(protocolId);
  const latest = useRef({ document, state });
  const own = useRef(new Set([begin.etag]));
  useEffect(() => {
    latest.current = { document, state };
  });

  const inTurn = useRef(oneAtATime());

  const store = useCallback(async (): Promise<string | null> => {
    const now = latest.current;
    if (now.document === now.state.saved) return now.state.etag;
    if (!mayWrite || now.state.status === 'overtaken') return null;
    dispatch({ kind: 'sent' });
    try {
      const etag = await save(now.document, now.state.etag);
      own.current.add(etag);
      latest.current = { ...latest.current, state: { ...latest.current.state, etag, saved: now.document } };
      dispatch({ kind: 'stored', etag, document: now.document, present: latest.current.document });
      return etag;
    } catch (error) {
      dispatch(failureOf(error));
      return null;
    }
  }, [mayWrite, save]);
  // The next save is over what this one stored, not over what was there before it.
  const flush = useCallback(() => inTurn.current(store), [store]);

  useEffect(() => dispatch({ kind: 'edited', document }), [document]);
  useKept(protocolId, document, state);
  useRetry(state, dispatch);
  useEffect(() => {
    if (state.status !== 'unsaved') return undefined;
    const timer = setTimeout(() => void flush(), quietMs);
    return () => clearTimeout(timer);
  }, [state.status, document, flush]);
  useEffect(() => () => void (latest.current.state.status === 'unsaved' ? flush() : undefined), [flush]);

  return useMemo(
    () => ({
      state,
      flush,
      adopt: (etag, adopted) => {
        own.current.add(etag);
        dispatch({ kind: 'adopted', etag, document: adopted, present: latest.current.document });
      },
      tryAgain: () => dispatch({ kind: 'try-again' }),
      isOwn: (etag) => own.current.has(etag),
    }),
    [state, flush],
  );
}

function useSave(protocolId: string): (document: ProtocolDocument, etag: string) => Promise<string> {
  const send = useRef(useLabCall(saveProtocol));
  const queries = useQueryClient();
  const { labId } = useLab();
  return useCallback(
    async (document, ifMatch) => {
      const { etag } = await send.current({ params: { protocolId }, ifMatch, body: { document }, keepalive: true });
      void queries.invalidateQueries({ queryKey: labKey(labId, listProtocols) });
      return etag ?? ifMatch;
    },
    [protocolId, queries, labId],
  );
}

function useKept(protocolId: string, document: ProtocolDocument, { status, etag, saved }: SaveState) {
  useEffect(() => {
    if (document === saved) dropBackup(protocolId);
    else keepBackup(protocolId, { etag, document });
  }, [protocolId, document, saved, etag, status]);
}

/** Tries again by itself when the connection or the session is back. */
function useRetry({ status }: SaveState, dispatch: (event: SaveEvent) => void) {
  const { online } = useConnection();
  const signedIn = useSession().state.kind === 'signed-in';
  useEffect(() => {
    if ((status === 'unreachable' && online) || (status === 'signed-out' && signedIn)) dispatch({ kind: 'try-again' });
  }, [status, online, signedIn, dispatch]);
}
