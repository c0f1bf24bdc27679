import type { SpotPiece } from '@/shared/spot/buffer';

/** Pieces that lie on the device, so that a page that was closed or broke down loses nothing of what waits. */
export interface PieceKeep {
  /** Those that a page before this one left, oldest first. */
  load(): Promise<SpotPiece[]>;
  /** All of it or nothing. */
  change(change: PieceChange): Promise<void>;
}

export interface PieceChange {
  /** New ones, and those that have grown. */
  put: readonly SpotPiece[];
  /** Ids of those that are not held any more. */
  remove: readonly number[];
}

/** What has to be changed on the device so that it holds what is held here. `kept`: samples on the device by the id of their piece. */
export function changeFrom(kept: ReadonlyMap<number, number>, held: readonly SpotPiece[]): PieceChange {
  const ids = new Set(held.map(({ id }) => id));
  return {
    put: held.filter(({ id, samples }) => kept.get(id) !== samples.length),
    remove: [...kept.keys()].filter((id) => !ids.has(id)),
  };
}

interface PieceRecord {
  rigId: string;
  id: number;
  channel: string;
  utcMs: Float64Array;
  mm: Float64Array;
}

const databaseName = 'evenfall-spot';
const storeName = 'pieces';

/** The pieces of a rig's reader in the browser's IndexedDB, 16 bytes a sample. */
export function devicePieces(rigId: string): PieceKeep {
  let opened: Promise<IDBDatabase> | null = null;
  const database = () => (opened ??= open());
  return {
    async load() {
      const store = (await database()).transaction(storeName).objectStore(storeName);
      const records = await answerOf<PieceRecord[]>(store.getAll(IDBKeyRange.bound([rigId], [rigId, []])));
      return records.map(({ id, channel, utcMs, mm }) => ({
        id,
        channel,
        samples: Array.from(utcMs, (at, index) => ({ utcMs: at, mm: mm[index] as number })),
      }));
    },
    async change({ put, remove }) {
      const transaction = (await database()).transaction(storeName, 'readwrite');
      const store = transaction.objectStore(storeName);
      for (const { id, channel, samples } of put) {
        const record: PieceRecord = {
          ...{ rigId, id, channel },
          utcMs: Float64Array.from(samples, ({ utcMs }) => utcMs),
          mm: Float64Array.from(samples, ({ mm }) => mm),
        };
        store.put(record);
      }
      for (const id of remove) store.delete([rigId, id]);
      await new Promise<void>((resolve, reject) => {
        transaction.oncomplete = () => resolve();
        transaction.onabort = () => reject(transaction.error ?? new Error('it was broken off'));
      });
    },
  };
}

async function open(): Promise<IDBDatabase> {
  if (typeof indexedDB === 'undefined') throw new Error('it has no store for pages');
  const request = indexedDB.open(databaseName, 1);
  request.onupgradeneeded = () => request.result.createObjectStore(storeName, { keyPath: ['rigId', 'id'] });
  return answerOf(request);
}

function answerOf<T>(request: IDBRequest<T>): Promise<T> {
  return new Promise((resolve, reject) => {
    request.onsuccess = () => resolve(request.result);
    request.onerror = () => reject(request.error ?? new Error('it did not answer'));
  });
}
