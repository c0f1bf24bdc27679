/** The SHA-256, in lower-case hex, that a text gives with or without a leading `sha256:`; null where it gives none. */
export function sha256In(text: string): string | null {
  return /^(?:sha256:)?([0-9a-f]{64})$/i.exec(text)?.[1]?.toLowerCase() ?? null;
}
