import type { ProtocolDocument } from '@/shared/protocol/document';

/**
 * What has become of the draft on its way to the server. `refused`: the server does not take this document, the next
 * edit is tried again; `unreachable`, `signed-out`: tried again when that is over; `overtaken`: somebody else saved,
 * and a person decides.
 */
export type SaveStatus = 'saved' | 'unsaved' | 'saving' | 'refused' | 'unreachable' | 'signed-out' | 'overtaken';

export interface SaveState {
  status: SaveStatus;
  /** ETag of the draft as the server has it. */
  etag: string;
  /** The document as the server has it. */
  saved: ProtocolDocument;
  /** The sentence of the last refusal. */
  detail: string;
}

export type SaveEvent =
  | { kind: 'edited'; document: ProtocolDocument }
  | { kind: 'sent' }
  | { kind: 'stored'; etag: string; document: ProtocolDocument; present: ProtocolDocument }
  | { kind: 'failed'; status: 'refused' | 'unreachable' | 'signed-out' | 'overtaken'; detail: string }
  /** The server's draft is taken as the base, whoever wrote it. */
  | { kind: 'adopted'; etag: string; document: ProtocolDocument; present: ProtocolDocument }
  | { kind: 'try-again' };

export const beginSave = (etag: string, document: ProtocolDocument): SaveState => ({ status: 'saved', etag, saved: document, detail: '' });

const base = (etag: string, document: ProtocolDocument, present: ProtocolDocument): SaveState => ({
  status: present === document ? 'saved' : 'unsaved',
  etag,
  saved: document,
  detail: '',
});

/** The way of a draft to the server, pure. A conflict is left only by a person's decision. */
export function saveReducer(state: SaveState, event: SaveEvent): SaveState {
  switch (event.kind) {
    case 'edited':
      if (state.status === 'saving' || state.status === 'overtaken') return state;
      return { ...state, status: event.document === state.saved ? 'saved' : 'unsaved' };
    case 'sent':
      return { ...state, status: 'saving', detail: '' };
    case 'stored':
    case 'adopted':
      return base(event.etag, event.document, event.present);
    case 'failed':
      return { ...state, status: event.status, detail: event.detail };
    case 'try-again':
      return state.status === 'unreachable' || state.status === 'signed-out' || state.status === 'refused'
        ? { ...state, status: 'unsaved' }
        : state;
  }
}
