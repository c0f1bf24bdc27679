import { beginSave, saveReducer, type SaveEvent, type SaveState } from '@/components/protocols/save-reducer';
import type { ProtocolDocument } from '@/shared/protocol/document';

const draft = (name: string): ProtocolDocument => ({ formatVersion: 1, name, steps: [{ kind: 'home' }] });
const [first, second, third, theirs] = [draft('first'), draft('second'), draft('third'), draft('theirs')] as [
  ProtocolDocument,
  ProtocolDocument,
  ProtocolDocument,
  ProtocolDocument,
];
const after = (...events: SaveEvent[]): SaveState => events.reduce(saveReducer, beginSave('"1"', first));

test('an edit, the way to the server, the new base', () => {
  expect(after({ kind: 'edited', document: second }).status).toBe('unsaved');
  expect(after({ kind: 'edited', document: second }, { kind: 'sent' }).status).toBe('saving');
  expect(
    after({ kind: 'edited', document: second }, { kind: 'sent' }, { kind: 'stored', etag: '"2"', document: second, present: second }),
  ).toMatchObject({ status: 'saved', etag: '"2"', saved: second });
});

test('what is typed while saving is saved next, on top of what was stored', () => {
  const state = after(
    { kind: 'edited', document: second },
    { kind: 'sent' },
    { kind: 'edited', document: third },
    { kind: 'stored', etag: '"2"', document: second, present: third },
  );
  expect(state).toMatchObject({ status: 'unsaved', etag: '"2"', saved: second });
});

test('undoing back to the saved draft needs no save', () => {
  expect(after({ kind: 'edited', document: second }, { kind: 'edited', document: first }).status).toBe('saved');
});

test.each(['unreachable', 'signed-out', 'refused'] as const)('%s is tried again, and by the next edit too', (status) => {
  const failed = after({ kind: 'edited', document: second }, { kind: 'sent' }, { kind: 'failed', status, detail: 'why' });
  expect(failed).toMatchObject({ status, detail: 'why', etag: '"1"' });
  expect(saveReducer(failed, { kind: 'try-again' }).status).toBe('unsaved');
  expect(saveReducer(failed, { kind: 'edited', document: third }).status).toBe('unsaved');
});

describe('somebody else saved meanwhile', () => {
  const overtaken = after({ kind: 'edited', document: second }, { kind: 'sent' }, { kind: 'failed', status: 'overtaken', detail: '' });

  test('nothing but a person’s choice ends it', () => {
    expect(saveReducer(overtaken, { kind: 'edited', document: third }).status).toBe('overtaken');
    expect(saveReducer(overtaken, { kind: 'try-again' }).status).toBe('overtaken');
  });

  test('keeping mine saves it on top of theirs', () => {
    expect(saveReducer(overtaken, { kind: 'adopted', etag: '"5"', document: theirs, present: second })).toMatchObject({
      status: 'unsaved',
      etag: '"5"',
    });
  });

  test('taking theirs leaves nothing to save', () => {
    expect(saveReducer(overtaken, { kind: 'adopted', etag: '"5"', document: theirs, present: theirs })).toMatchObject({
      status: 'saved',
      etag: '"5"',
    });
  });
});
