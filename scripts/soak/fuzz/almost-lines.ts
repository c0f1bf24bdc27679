import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { crc16, encode, type Item } from '@/firmware-protocol/codec';
import valid from '@/firmware-protocol/vectors/valid.json';

/** A body with its check word and line feed. */
export const sealed = (body: string) => `${body} ${crc16(body).toString(16).toUpperCase().padStart(4, '0')}\n`;

const TOKENS = (
  'q r e x 0 00 1 7 -1 -0 -9999999 9999999 10000000 65535 65536 99999999 100000000 4294967295 4294967296 00000000 1A2B0001 1a2b0001 FFFFFFFF 0000ABCD ' +
  'ABCD now free keep none ident hello status renew limits events home move hold stop off nudge teach mov statue ok no hi 000000012.345678 12.345678 ' +
  '999999999.999999 0000000123.45678 100 -100 99 1.5 A 9a'
).split(' ');

/** Lines between right and wrong, without their line feeds: real ones changed by a token, a byte or a cut, most of them honestly sealed. */
export function* almostLines(count: number, seed: number): Generator<string> {
  const random = xoroshiro128plus(seed);
  const upTo = (last: number) => uniformInt(random, 0, last);
  const requests = valid.vectors.filter(({ line }) => line.startsWith('q')).map(({ line }) => line.slice(0, -5));
  const token = () => TOKENS[upTo(TOKENS.length - 1)] as string;
  for (let made = 0; made < count; made += 1) {
    const fields = (requests[upTo(requests.length - 1)] as string).split(' ');
    for (let changes = upTo(2); changes > 0; changes -= 1) {
      const at = upTo(fields.length - 1);
      fields.splice(at, upTo(1), ...(upTo(4) === 0 ? [] : [token()]));
    }
    let line = sealed(fields.join(' ')).slice(0, -1);
    if (upTo(3) === 0) {
      const at = upTo(line.length - 1);
      line = line.slice(0, at) + String.fromCharCode(upTo(255)).replace('\n', ' ') + line.slice(at + upTo(1));
    }
    yield upTo(9) === 0 ? `${line}\r` : line;
  }
}

/** What a controller makes of an item, as the host program tells it: whatever is no request is dropped. */
export function asRead(item: Item): string[] {
  if (item.kind === 'blank') return [];
  if (item.kind === 'unusable') return [`${item.epoch} ${item.session} ${item.number} refused ${item.code}`];
  if (item.kind !== 'request') return ['dropped'];
  const body = encode(item).slice('q '.length, -' 0000\n'.length);
  return [item.order.word === 'hello' ? body.replace(/ hello .*/, ' hello') : body];
}
