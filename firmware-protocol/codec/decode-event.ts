import { choiceField, GREATEST_EPOCH, identifierField, placeField, stampField, wholeField } from './fields';
import { BOOT_CAUSES, END_CAUSES, type EventMessage, type Happening } from './messages';

/** SPEC 7.1. A kind that is not known is an event of kind `other` (7.6); a known one with broken fields is no event. */
export function decodeEvent(fields: string[]): EventMessage | undefined {
  const number = wholeField(fields[1], GREATEST_EPOCH);
  const atUs = stampField(fields[2]);
  const what = decodeHappening(fields);
  return number === undefined || number === 0 || atUs === undefined || what === undefined
    ? undefined
    : { kind: 'event', number, atUs, what };
}

function decodeHappening(fields: string[]): Happening | undefined {
  const word = fields[3];
  switch (word) {
    case 'began':
    case 'homed':
    case 'ended':
    case 'warn':
      return decodeTagged(word, fields);
    case 'edge': {
      const position = placeField(fields[4]);
      const direction = choiceField(fields[5], ['ccw', 'cw']);
      return position === undefined || direction === undefined ? undefined : { word, position, direction };
    }
    case 'lease':
    case 'limit': {
      const position = placeField(fields[4]);
      return position === undefined ? undefined : { word, position };
    }
    case 'boot': {
      const cause = choiceField(fields[4], BOOT_CAUSES);
      return cause === undefined ? undefined : { word, cause };
    }
    case 'interlock':
    case 'supply':
    case 'key':
      return decodeInput(word, fields[4]);
    default:
      return word !== undefined && /^[a-z]+$/.test(word) ? { word: 'other', name: word } : undefined;
  }
}

function decodeTagged(word: 'began' | 'homed' | 'ended' | 'warn', fields: string[]): Happening | undefined {
  const tag = identifierField(fields[4]);
  if (tag === undefined) return undefined;
  if (word === 'warn') return { word, tag };
  const position = placeField(fields[5]);
  if (position === undefined) return undefined;
  if (word !== 'ended') return { word, tag, position };
  const cause = choiceField(fields[6], END_CAUSES);
  return cause === undefined ? undefined : { word, tag, position, cause };
}

function decodeInput(word: 'interlock' | 'supply' | 'key', level: string | undefined): Happening | undefined {
  if (word === 'interlock') return level === 'open' || level === 'closed' ? { word, closed: level === 'closed' } : undefined;
  if (word === 'supply') return level === 'lost' || level === 'present' ? { word, present: level === 'present' } : undefined;
  return level === 'on' || level === 'off' ? { word, on: level === 'on' } : undefined;
}
