/** Where whole files are kept byte for byte: a folder, or S3. Names are made by the server, with `/` between their parts, and none comes twice. */
export interface ObjectStore {
  /**
   * Keeps a file, whole or not at all.
   * @throws Error where the store does not take it, or the source breaks off or has another length
   */
  put(name: string, source: AsyncIterable<Uint8Array>, file: ObjectFacts): Promise<void>;
  /** The bytes as they were put. @throws MissingObjectError */
  read(name: string): AsyncIterable<Uint8Array>;
  /** One that is not there is removed already. */
  remove(name: string): Promise<void>;
  /** Bytes that may still be put; null: as many as one likes, or nobody tells. */
  freeBytes(): Promise<number | null>;
  close(): void;
}

export interface ObjectFacts {
  bytes: number;
  /** SHA-256, lower-case hex. */
  sha256: string;
}

export class MissingObjectError extends Error {
  override readonly name = 'MissingObjectError';
  constructor(readonly object: string) {
    super(`the object store has no ${object}`);
  }
}

/** What was read is not what was put. */
export class SpoiltObjectError extends Error {
  override readonly name = 'SpoiltObjectError';
  constructor(readonly object: string) {
    super(`${object} of the object store has another length or another SHA-256 than the file that was put there`);
  }
}
