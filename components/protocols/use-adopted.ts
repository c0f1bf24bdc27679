import { useEffect, useRef } from 'react';
import { useToast } from '@/components/ui';
import type { ProtocolView } from '@/shared/contracts/protocols';
import type { ProtocolDocument } from '@/shared/protocol/document';
import type { DraftSync } from './use-draft-sync';

interface AdoptedInput {
  protocol: ProtocolView;
  etag: string;
  sync: DraftSync;
  put: (document: ProtocolDocument) => void;
}

/** A newer draft read from the server is taken over while nothing here is unsaved; otherwise the next save meets it and asks. */
export function useAdopted(input: AdoptedInput): void {
  const toast = useToast();
  const latest = useRef({ ...input, toast });
  useEffect(() => {
    latest.current = { ...input, toast };
  });
  const { etag } = input;
  useEffect(() => {
    const { protocol, sync, put, toast: bread } = latest.current;
    if (sync.state.status !== 'saved' || sync.isOwn(etag)) return;
    if (JSON.stringify(protocol.document) === JSON.stringify(sync.state.saved)) return sync.adopt(etag, sync.state.saved);
    put(protocol.document);
    sync.adopt(etag, protocol.document);
    bread.show({ text: `${protocol.updatedBy} saved a newer draft; it is shown now. Undo brings the old one back.` });
  }, [etag]);
}
