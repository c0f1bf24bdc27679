import { MOST_PICTURE_BYTES } from '@/shared/camera/picture';
import { NoPicture } from '../interfaces/camera';

const MOST_HEAD_BYTES = 4096;
const lineEnd = '\r\n';

/**
 * The first whole picture of an MJPEG stream (multipart/x-mixed-replace, parts as in RFC 2046 5.1); then no more is read of it.
 * @throws NoPicture
 */
export async function firstPart(stream: AsyncIterable<Buffer>, boundary: string): Promise<Buffer> {
  let held: Buffer = Buffer.alloc(0);
  for await (const chunk of stream) {
    held = Buffer.concat([held, chunk]);
    const found = partIn(held, boundary);
    if (found !== null) return found;
    if (held.length > MOST_PICTURE_BYTES + 2 * MOST_HEAD_BYTES)
      throw new NoPicture('its stream goes on for more than 1 MiB without a whole picture');
  }
  throw new NoPicture('its stream ended before a picture was whole');
}

function partIn(held: Buffer, boundary: string): Buffer | null {
  const begin = held.indexOf(`--${boundary}`);
  if (begin < 0) return null;
  const headEnd = held.indexOf(lineEnd + lineEnd, begin);
  if (headEnd < 0) return null;
  const head = held.subarray(begin, headEnd).toString('latin1');
  const type = /^content-type:\s*([^\s;]+)/im.exec(head)?.[1]?.toLowerCase() ?? '';
  if (type !== 'image/jpeg')
    throw new NoPicture(`its stream holds ${type === '' ? 'parts without a content type' : type} instead of image/jpeg`);
  const from = headEnd + 2 * lineEnd.length;
  const length = Number(/^content-length:\s*(\d+)\s*$/im.exec(head)?.[1] ?? Number.NaN);
  if (length > MOST_PICTURE_BYTES) throw new NoPicture('its pictures have more than 1 MiB. Set it to smaller ones');
  if (!Number.isNaN(length)) return held.length >= from + length ? held.subarray(from, from + length) : null;
  const next = held.indexOf(`${lineEnd}--${boundary}`, from);
  return next < 0 ? null : held.subarray(from, next);
}
