import { protocolDocumentSchema, type ProtocolDocument } from '@/shared/protocol/document';

/** A draft that has not reached the server yet is kept on the device, so that a closed page or an empty battery loses nothing. */

const keyOf = (protocolId: string) => `evenfall.draft.${protocolId}`;

export interface DraftBackup {
  /** ETag of the server's draft that this one was made from. */
  etag: string;
  document: ProtocolDocument;
}

export function keepBackup(protocolId: string, backup: DraftBackup): void {
  try {
    window.localStorage.setItem(keyOf(protocolId), JSON.stringify(backup));
  } catch {
    return;
  }
}

export function dropBackup(protocolId: string): void {
  try {
    window.localStorage.removeItem(keyOf(protocolId));
  } catch {
    return;
  }
}

/** With something in every empty list: a draft under way may have a repeat with nothing in it yet, and is kept all the same. */
function filled(value: unknown): unknown {
  if (Array.isArray(value)) return value.map(filled);
  if (typeof value !== 'object' || value === null) return value;
  return Object.fromEntries(
    Object.entries(value).map(([name, inner]) => [
      name,
      name === 'steps' && Array.isArray(inner) && inner.length === 0 ? [{ kind: 'home' }] : filled(inner),
    ]),
  );
}

/** The kept draft, or null where there is none that the editor can show. */
export function readBackup(protocolId: string): DraftBackup | null {
  try {
    const value: unknown = JSON.parse(window.localStorage.getItem(keyOf(protocolId)) ?? 'null');
    if (typeof value !== 'object' || value === null || !('etag' in value) || !('document' in value) || typeof value.etag !== 'string')
      return null;
    return protocolDocumentSchema.safeParse(filled(value.document)).success
      ? { etag: value.etag, document: value.document as ProtocolDocument }
      : null;
  } catch {
    return null;
  }
}
