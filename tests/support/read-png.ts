import { inflateSync } from 'node:zlib';

export interface Pixels {
  width: number;
  height: number;
  /** Red, green, blue of a pixel. */
  at(x: number, y: number): readonly [number, number, number];
}

/** Reads a PNG (ISO/IEC 15948) of eight bits of red, green and blue whose rows have no filter. */
export function readPng(png: Uint8Array): Pixels {
  const bytes = Buffer.from(png);
  const data: Buffer[] = [];
  let head = Buffer.alloc(0);
  for (let at = 8; at < bytes.length;) {
    const length = bytes.readUInt32BE(at);
    const type = bytes.toString('latin1', at + 4, at + 8);
    const body = bytes.subarray(at + 8, at + 8 + length);
    if (type === 'IHDR') head = body;
    if (type === 'IDAT') data.push(body);
    at += 12 + length;
  }
  const [width, height] = [head.readUInt32BE(0), head.readUInt32BE(4)];
  if (head[8] !== 8 || head[9] !== 2) throw new Error('not eight bits of red, green and blue');
  const rows = inflateSync(Buffer.concat(data));
  const stride = 1 + 3 * width;
  for (let y = 0; y < height; y += 1) if (rows[y * stride] !== 0) throw new Error(`row ${String(y)} has a filter`);
  const part = (x: number, y: number, of: number) => rows[y * stride + 1 + 3 * x + of] ?? 0;
  return { width, height, at: (x, y) => [part(x, y, 0), part(x, y, 1), part(x, y, 2)] };
}
