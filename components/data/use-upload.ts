import { useQueryClient } from '@tanstack/react-query';
import { useEffect, useRef, useState } from 'react';
import { call, isProblem, labKey, monotonicMs, useLab, useLabQuery } from '@/components/api';
import { beginImport, cancelImport, getImport, listImports, patchImportContent, type ImportView } from '@/shared/contracts/import-files';
import { upload, type UploadProgress } from './upload';

/** A part that takes longer is tried again, smaller. */
const longestPartMs = 120_000;

/** A file that came in part and can be gone on with. */
export const isUnfinished = ({ state, wantedBytes }: ImportView): boolean => state === 'waiting' && wantedBytes !== null;

const changedAtOf = (file: File) => new Date(file.lastModified).toISOString();

/** The same file, as far as a browser tells: name, length, last change. */
const isOf = (view: ImportView, file: File) =>
  isUnfinished(view) && view.fileName === file.name && view.wantedBytes === file.size && view.changedAt === changedAtOf(file);

/** Resolves after so many ms, or when the browser says that the network is back. */
function waitForNetwork(ms: number, signal: AbortSignal): Promise<void> {
  return new Promise((resolve) => {
    const done = () => {
      clearTimeout(timer);
      window.removeEventListener('online', done);
      signal.removeEventListener('abort', done);
      resolve();
    };
    const timer = setTimeout(done, ms);
    window.addEventListener('online', done);
    signal.addEventListener('abort', done);
  });
}

/** Breaks off with the whole, or after the longest time of a part. */
async function withLimit<T>(whole: AbortSignal, work: (signal: AbortSignal) => Promise<T>): Promise<T> {
  const abort = new AbortController();
  const end = () => abort.abort();
  const timer = setTimeout(end, longestPartMs);
  whole.addEventListener('abort', end);
  try {
    return await work(abort.signal);
  } finally {
    clearTimeout(timer);
    whole.removeEventListener('abort', end);
  }
}

/** Files of a run on their way to the server. */
export function useUpload(runId: string) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const files = useLabQuery(listImports, { params: { runId } });
  const [progress, setProgress] = useState<(UploadProgress & { fileName: string }) | null>(null);
  const under = useRef<{ abort: AbortController; importId: string } | null>(null);
  useEffect(() => () => under.current?.abort.abort(), []);
  const refresh = () => queries.invalidateQueries({ queryKey: labKey(labId, listImports) });

  const throwAway = async (importId: string) => {
    await call(cancelImport, { params: { labId, importId } }).catch((error: unknown) => {
      if (!isProblem(error, 'not-found')) throw error;
    });
    await refresh();
  };

  /** Sends a file, or what is missing of one that came in part. Null: it was cancelled. */
  const send = async (file: File): Promise<ImportView | null> => {
    const abort = new AbortController();
    const known = (await call(listImports, { params: { labId, runId } })).data.items.find((one) => isOf(one, file));
    const body = { fileName: file.name, bytes: file.size, changedAt: changedAtOf(file) };
    const view = known ?? (await call(beginImport, { params: { labId, runId }, body })).data;
    const params = { labId, importId: view.id };
    under.current = { abort, importId: view.id };
    try {
      return await upload({
        ...{ file, view, signal: abort.signal, wait: waitForNetwork, nowMs: monotonicMs },
        send: (offset, raw, signal) =>
          withLimit(signal, async (limited) => (await call(patchImportContent, { params, query: { offset }, raw, signal: limited })).data),
        look: (signal) => withLimit(signal, async (limited) => (await call(getImport, { params, signal: limited })).data),
        tell: (told) => setProgress({ ...told, fileName: file.name }),
      });
    } catch (error) {
      if (abort.signal.aborted) return null;
      throw error;
    } finally {
      under.current = null;
      setProgress(null);
      await refresh();
    }
  };

  /** Breaks off and throws away what has come; without a network that stays for whoever looks at the page next. */
  const cancel = async () => {
    const going = under.current;
    if (going === null) return;
    going.abort.abort();
    await throwAway(going.importId).catch(() => undefined);
  };

  const unfinished = (files.data?.data.items ?? []).filter((one) => isUnfinished(one) && progress === null);
  return { send, cancel, throwAway, progress, unfinished };
}
