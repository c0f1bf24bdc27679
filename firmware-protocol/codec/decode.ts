import { crc16 } from './crc';
import { decodeEvent } from './decode-event';
import { decodeReply } from './decode-reply';
import { decodeRequest } from './decode-request';
import { ALPHABET, hexNumberField } from './fields';
import { MAX_LINE_BYTES, type Blank, type Garbage, type GarbageReason, type Item } from './messages';

const BLANK: Blank = { kind: 'blank' };
/** A space and four digits. */
const CHECK_LENGTH = 5;

/**
 * What one received line says. `line` comes without its line feed, one character for each byte. Never throws:
 * whatever is not a message of the protocol is an item of its own, with the reason (SPEC 1.6).
 */
export function decodeLine(line: string): Item {
  const text = line.charCodeAt(line.length - 1) === 13 ? line.slice(0, -1) : line;
  if (text.length === 0) return BLANK;
  if (text.length > MAX_LINE_BYTES - 1) return garbage('length', line);
  const alphabet = ALPHABET;
  for (let index = 0; index < text.length; index += 1) {
    if (alphabet[text.charCodeAt(index)] !== 1) return garbage('alphabet', line);
  }
  const bodyLength = text.length - CHECK_LENGTH;
  const check = hexNumberField(text.slice(bodyLength + 1), 4);
  if (bodyLength < 1 || text.charCodeAt(bodyLength) !== 32 || check === undefined || check !== crc16(text, bodyLength))
    return garbage('check', line);
  const fields = text.slice(0, bodyLength).split(' ');
  return decodeFields(fields) ?? garbage('grammar', line);
}

function decodeFields(fields: string[]): Item | undefined {
  switch (fields[0]) {
    case 'q':
      return decodeRequest(fields);
    case 'r':
      return decodeReply(fields);
    case 'e':
      return decodeEvent(fields);
    default:
      return undefined;
  }
}

export function garbage(reason: GarbageReason, line: string): Garbage {
  return { kind: 'garbage', reason, line };
}
