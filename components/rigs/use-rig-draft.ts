import { useMemo, useState } from 'react';
import type { RigDocument } from '@/shared/rig/document';
import { documentChanges, type DocumentChange } from './document-rows';

export interface RigDraft {
  document: RigDocument;
  changes: DocumentChange[];
  set: (document: RigDocument) => void;
  discard: () => void;
}

/** Changes to a rig document that are not yet a revision. */
export function useRigDraft(saved: RigDocument): RigDraft {
  const [draft, setDraft] = useState<RigDocument | null>(null);
  const document = draft ?? saved;
  const changes = useMemo(() => documentChanges(saved, document), [saved, document]);
  return { document, changes, set: setDraft, discard: () => setDraft(null) };
}
