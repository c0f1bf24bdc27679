import { crc16, decodeLine, encode, LineSplitter, MAX_LINE_BYTES, type Item, type Message } from '@/firmware-protocol/codec';
import invalid from '@/firmware-protocol/vectors/invalid.json';
import streams from '@/firmware-protocol/vectors/streams.json';
import valid from '@/firmware-protocol/vectors/valid.json';

test('the check value of CRC-16/CCITT-FALSE is 0x29B1', () => {
  // Catalogue of parametrised CRC algorithms: CRC-16/IBM-3740, also called CCITT-FALSE.
  expect(crc16('123456789')).toBe(0x29b1);
});

describe('valid lines', () => {
  test.each(valid.vectors.map((vector) => [vector.why, vector] as const))('%s', (_why, vector) => {
    expect(decodeLine(vector.line)).toEqual(vector.means);
  });

  /** The others are understood, but never written by this version. */
  const written = valid.vectors.filter((vector) => vector.writtenSo);
  test.each(written.map((vector) => [vector.line, vector] as const))('is written as %s', (_line, vector) => {
    const line = encode(vector.means as Message);
    expect(line).toBe(`${vector.line}\n`);
    expect(line.length).toBeLessThanOrEqual(MAX_LINE_BYTES);
  });
});

describe('invalid lines', () => {
  test.each(invalid.vectors.map((vector) => [vector.why, vector] as const))('%s', (_why, vector) => {
    expect(decodeLine(vector.line)).toEqual({ kind: 'garbage', reason: vector.reason, line: vector.line });
  });
});

describe('streams', () => {
  const short = (item: Item) => (item.kind === 'garbage' ? { garbage: item.reason } : item.kind === 'blank' ? { blank: true } : item);
  const awaited = (item: { message?: string; garbage?: string; blank?: boolean }) =>
    item.message === undefined ? item : decodeLine(item.message);

  test.each(streams.vectors.map((vector) => [vector.why, vector] as const))('%s', (_why, vector) => {
    const splitter = new LineSplitter();
    expect(vector.chunks.flatMap((chunk) => splitter.push(chunk)).map(short)).toEqual(vector.items.map(awaited));
  });
});
