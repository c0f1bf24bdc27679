import type { ImportMapping } from '@/shared/contracts/data';

/** The text of a file in any of the encodings that programs write tables in. */

/** A file of which no row can be shown: what it is instead. */
export class UnreadableFile extends Error {}

export type Encoding = NonNullable<ImportMapping['encoding']>;

/** By the names of the WHATWG's Encoding Standard, whose windows-1252 holds all that Latin-1 prints. */
const decoders = { 'utf-8': 'utf-8', 'utf-16le': 'utf-16le', 'utf-16be': 'utf-16be', 'latin-1': 'windows-1252' } as const;

/** What a byte order mark says (Unicode 15, 23.8); null without one. */
function markOf(head: Uint8Array): Encoding | null {
  if (head[0] === 0xef && head[1] === 0xbb && head[2] === 0xbf) return 'utf-8';
  if (head[0] === 0xff && head[1] === 0xfe) return 'utf-16le';
  return head[0] === 0xfe && head[1] === 0xff ? 'utf-16be' : null;
}

/** Signs of a table are ASCII: in UTF-16 every other byte of them is zero. */
function withoutMark(head: Uint8Array): Encoding {
  if (!head.includes(0)) return 'utf-8';
  const half = Math.floor(head.length / 2);
  const zeros = [0, 1].map((offset) => head.subarray(0, 2 * half).filter((byte, index) => byte === 0 && index % 2 === offset).length);
  if ((zeros[1] ?? 0) > 0.8 * half && zeros[0] === 0) return 'utf-16le';
  if ((zeros[0] ?? 0) > 0.8 * half && zeros[1] === 0) return 'utf-16be';
  throw new UnreadableFile('The file is not text: it holds zero bytes. A spreadsheet must be saved as CSV first.');
}

/**
 * The first bytes of a file as text, and how they are encoded: by the byte order mark, else UTF-8 where they are that, else Latin-1.
 * @throws UnreadableFile for what is no text
 */
export function readHead(head: Uint8Array, whole: boolean): { text: string; encoding: Encoding } {
  if (head.length === 0) throw new UnreadableFile('The file is empty.');
  const encoding = markOf(head) ?? withoutMark(head);
  const text = decoded(head, encoding, whole) ?? (encoding === 'utf-8' ? decoded(head, 'latin-1', whole) : null);
  if (text === null || /[\u0000-\u0008\u000e-\u001f]/.test(text))
    throw new UnreadableFile('The file is not text: it holds control codes. A spreadsheet must be saved as CSV first.');
  return { text, encoding: decoded(head, encoding, whole) === null ? 'latin-1' : encoding };
}

function decoded(head: Uint8Array, encoding: Encoding, whole: boolean): string | null {
  try {
    return new TextDecoder(decoders[encoding], { fatal: true }).decode(head, { stream: !whole });
  } catch {
    return null;
  }
}

/** The text of a file, without its byte order mark, as its bytes come. What cannot be decoded becomes U+FFFD, which no number and no time holds. */
export async function* textOf(chunks: AsyncIterable<Uint8Array>, encoding: Encoding = 'utf-8'): AsyncGenerator<string> {
  const decoder = new TextDecoder(decoders[encoding]);
  for await (const chunk of chunks) yield decoder.decode(chunk, { stream: true });
  yield decoder.decode();
}
