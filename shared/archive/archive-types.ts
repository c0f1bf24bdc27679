/** SHA-256 in lower-case hex of bytes, or of a text as UTF-8. */
export type Sha256OfBytes = (data: string | Uint8Array) => string;

/** Path inside the archive, with forward slashes, to content. */
export type ArchiveFiles = ReadonlyMap<string, Uint8Array | string>;

export interface ArchiveWarning {
  code: string;
  message: string;
}

/** An archive while it is verified: what is found is added to the warnings. */
export interface ArchiveInHand {
  files: ArchiveFiles;
  sha256: Sha256OfBytes;
  warnings: ArchiveWarning[];
}
