/** Pictures of cameras as files. Pure. */

export const pictureTypes = ['image/jpeg', 'image/png'] as const;
export type PictureType = (typeof pictureTypes)[number];

/** Greatest size of a picture, bytes. */
export const MOST_PICTURE_BYTES = 1_048_576;

/** A picture and when it was taken. */
export interface Picture {
  bytes: Uint8Array;
  type: PictureType;
  takenUtcMs: number;
  /** Standard uncertainty of that instant, s. */
  uTakenS: number;
}

const begins = (bytes: Uint8Array, ...first: number[]) => first.every((byte, index) => bytes[index] === byte);

/** What the bytes are by their own beginning and end (JPEG: ISO/IEC 10918-1 B.1.1.3, SOI and EOI; PNG: ISO/IEC 15948 5.2), or null: neither, or cut off. */
export function pictureTypeOf(bytes: Uint8Array): PictureType | null {
  if (begins(bytes, 0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a)) return endsWithIend(bytes) ? 'image/png' : null;
  return begins(bytes, 0xff, 0xd8, 0xff) && lastOf(bytes) ? 'image/jpeg' : null;
}

/** Some cameras fill up with zeros, or write a line's end behind the picture. */
function lastOf(bytes: Uint8Array): boolean {
  let end = bytes.length;
  while (end > 2 && [0x00, 0x0a, 0x0d].includes(bytes[end - 1] ?? -1)) end -= 1;
  return bytes[end - 2] === 0xff && bytes[end - 1] === 0xd9;
}

const endsWithIend = (bytes: Uint8Array) => String.fromCharCode(...bytes.subarray(-8, -4)) === 'IEND';

export const endingOf = (type: PictureType): 'jpg' | 'png' => (type === 'image/png' ? 'png' : 'jpg');
