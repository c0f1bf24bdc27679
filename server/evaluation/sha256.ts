import { hash } from 'node:crypto';

/** SHA-256 in lower-case hex of bytes, or of a text as UTF-8. */
export function sha256Hex(data: string | Uint8Array): string {
  return hash('sha256', data, 'hex');
}
