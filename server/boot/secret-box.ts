import { createCipheriv, createDecipheriv, hkdfSync, randomBytes } from 'node:crypto';
import { mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import type { ServerConfig } from '../interfaces/server-config';
import { isSealed, sealedPrefix, type SecretBox } from '../interfaces/secret-box';

const keyFile = 'secret-key';
const nonceBytes = 12;
const tagBytes = 16;

/** The key of this state folder, made when it is needed first; nobody but the server's user reads it. */
function keyOf(stateDir: string): string {
  const path = join(stateDir, keyFile);
  mkdirSync(stateDir, { recursive: true });
  try {
    // Only where there is none: of two processes that begin at once one makes it, and both read it.
    writeFileSync(path, randomBytes(32).toString('hex'), { mode: 0o600, flag: 'wx' });
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code !== 'EEXIST') throw error;
  }
  return readFileSync(path, 'utf8').trim();
}

/**
 * AES-256-GCM (NIST SP 800-38D) under a key derived by HKDF (RFC 5869) from `secretKey`, or from the key of the state folder. The text it makes holds nonce, tag
 * and cipher, base64url.
 */
export function createSecretBox({ secretKey, stateDir }: Pick<ServerConfig, 'secretKey' | 'stateDir'>): SecretBox {
  let known: Buffer | null = null;
  const key = () =>
    (known ??= Buffer.from(hkdfSync('sha256', secretKey ?? keyOf(stateDir), '', 'evenfall: passwords in the database', 32)));
  return {
    seal(text, of) {
      const nonce = randomBytes(nonceBytes);
      const cipher = createCipheriv('aes-256-gcm', key(), nonce).setAAD(Buffer.from(of));
      const closed = Buffer.concat([cipher.update(text, 'utf8'), cipher.final()]);
      return sealedPrefix + Buffer.concat([nonce, cipher.getAuthTag(), closed]).toString('base64url');
    },
    open(sealed, of) {
      if (!isSealed(sealed)) return null;
      const bytes = Buffer.from(sealed.slice(sealedPrefix.length), 'base64url');
      if (bytes.length < nonceBytes + tagBytes) return null;
      try {
        const decipher = createDecipheriv('aes-256-gcm', key(), bytes.subarray(0, nonceBytes)).setAAD(Buffer.from(of));
        decipher.setAuthTag(bytes.subarray(nonceBytes, nonceBytes + tagBytes));
        return Buffer.concat([decipher.update(bytes.subarray(nonceBytes + tagBytes)), decipher.final()]).toString('utf8');
      } catch {
        return null;
      }
    },
  };
}
