declare module 'http_ece' {
  import type { ECDH } from 'node:crypto';

  export function decrypt(body: Buffer, keys: { version: 'aes128gcm'; privateKey: ECDH; dh: string; authSecret: string }): Buffer;
}
