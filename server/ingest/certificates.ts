import { X509Certificate } from 'node:crypto';

const block = /-----BEGIN CERTIFICATE-----[\s\S]*?-----END CERTIFICATE-----/g;

/** What is wrong with certificates in PEM, and what would be right; null where nothing is. */
export function certificateFault(pem: string): string | null {
  if (/PRIVATE KEY/.test(pem))
    return 'This holds a private key. Give the certificate of the authority alone, and keep the key to yourself.';
  const blocks = pem.match(block) ?? [];
  if (blocks.length === 0) return 'A certificate in PEM is needed: from -----BEGIN CERTIFICATE----- to -----END CERTIFICATE-----.';
  for (const [index, one] of blocks.entries()) {
    try {
      new X509Certificate(one);
    } catch {
      return `Certificate ${String(index + 1)} cannot be read. Copy the whole of its file, with the first and the last line.`;
    }
  }
  return null;
}
