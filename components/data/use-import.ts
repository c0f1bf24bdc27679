import { useQueryClient } from '@tanstack/react-query';
import { useReducer, useState } from 'react';
import { call, labKey, useLab, wordsOf } from '@/components/api';
import { checkImport, commitImport, readSamples, type ImportChoices } from '@/shared/contracts/data';
import { listImportMappings, listImports } from '@/shared/contracts/import-files';
import { completeMapping, importReducer, noImport } from './import-draft';
import { useUpload } from './use-upload';

const headBytes = 65_536;

export interface ImportFailure {
  title: string;
  detail: string;
  errors: readonly { path: string; message: string }[];
}

export interface StoredImport {
  stored: number;
  known: number;
  other: number;
  leftOut: number;
  choices: ImportChoices;
  channel: { id: string; name: string };
}

type Step = 'sending' | 'checking' | 'storing' | null;

/** One thing at a time: which step is under way, and why the last one failed. */
function useAttempt() {
  const [step, setStep] = useState<Step>(null);
  const [failure, setFailure] = useState<ImportFailure | null>(null);
  const attempt = async (which: Step, title: string, act: () => Promise<void>) => {
    setStep(which);
    setFailure(null);
    try {
      await act();
    } catch (error) {
      setFailure({ title, ...wordsOf(error) });
    } finally {
      setStep(null);
    }
  };
  return { step, failure, attempt, forget: () => setFailure(null) };
}

/** An import from the choice of the file to the stored samples. Every failure leaves what was typed as it is. */
export function useImport({ runId, rigId }: { runId: string; rigId: string }, channelName: string) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const [state, dispatch] = useReducer(importReducer, channelName, noImport);
  const { step, failure, attempt, forget } = useAttempt();
  const uploading = useUpload(runId);
  const [head, setHead] = useState<ArrayBuffer>(() => new ArrayBuffer(0));
  const [stored, setStored] = useState<StoredImport | null>(null);

  const mapping = state.draft === null ? null : completeMapping(state.draft);
  const importId = state.imported?.id ?? '';

  return {
    state,
    step,
    failure,
    head,
    stored,
    mapping,
    send: (file: File) =>
      attempt('sending', `${file.name} was not taken in`, async () => {
        setHead(await file.slice(0, headBytes).arrayBuffer());
        const imported = await uploading.send(file);
        if (imported === null) return;
        const { data } = await call(listImportMappings, { params: { labId, rigId } });
        dispatch({ kind: 'received', imported, remembered: data.items });
      }),
    upload: uploading.progress,
    unfinished: uploading.unfinished,
    cancel: () => attempt(null, 'What has come was not thrown away', uploading.cancel),
    throwAway: (id: string) => attempt(null, 'The file was not thrown away', () => uploading.throwAway(id)),
    guess: () => dispatch({ kind: 'guessed' }),
    change: (change: Parameters<typeof completeMapping>[0] extends infer D ? Partial<D> : never) => dispatch({ kind: 'changed', change }),
    name: (name: string) => dispatch({ kind: 'named', channelName: name }),
    settle: (choices: Partial<ImportChoices>) => dispatch({ kind: 'settled', choices }),
    check: () =>
      attempt('checking', 'The file was not checked', async () => {
        if (!mapping?.mapping) return;
        const { data } = await call(checkImport, {
          params: { labId, importId },
          body: { mapping: mapping.mapping, channelName: state.channelName },
        });
        dispatch({ kind: 'checked', check: data });
      }),
    store: () =>
      attempt('storing', 'Nothing was stored', async () => {
        if (!mapping?.mapping) return;
        const { data } = await call(commitImport, {
          params: { labId, importId },
          body: { mapping: mapping.mapping, channelName: state.channelName, choices: state.choices },
        });
        setStored({ ...data, choices: state.choices });
        await queries.invalidateQueries({ queryKey: labKey(labId, readSamples) });
        await queries.invalidateQueries({ queryKey: labKey(labId, listImports) });
      }),
    anotherFile: () => {
      dispatch({ kind: 'another-file' });
      setStored(null);
      forget();
    },
  };
}
