import {
  choiceField,
  GREATEST_EPOCH,
  GREATEST_NUMBER,
  identifierField,
  limitFields,
  positionField,
  rateField,
  stampField,
  wholeField,
} from './fields';
import type { Order, Request, UnusableRequest } from './messages';

const FRAME_FIELDS = 5;
const GREATEST_VERSION = 99;

/** SPEC 2.2 and 4. Undefined when the frame itself is broken. */
export function decodeRequest(fields: string[]): Request | UnusableRequest | undefined {
  const epoch = wholeField(fields[1], GREATEST_EPOCH);
  const session = identifierField(fields[2]);
  const number = wholeField(fields[3], GREATEST_NUMBER);
  const word = fields[4];
  if (epoch === undefined || session === undefined || number === undefined || word === undefined || !/^[a-z]+$/.test(word))
    return undefined;
  const order = decodeOrder(word, fields);
  if (order === 'word' || order === 'field') return { kind: 'unusable', epoch, session, number, code: order };
  return { kind: 'request', epoch, session, number, order };
}

function decodeOrder(word: string, fields: string[]): Order | 'word' | 'field' {
  const given = fields.length - FRAME_FIELDS;
  const none = given === 0;
  switch (word) {
    case 'status':
    case 'renew':
    case 'limits':
    case 'ident':
      return none ? { word } : 'field';
    // SPEC 4.1: stops are carried out whatever follows their word.
    case 'hold':
    case 'off':
      return { word };
    case 'stop':
      return { word, drivers: given === 1 ? (choiceField(fields[5], ['keep', 'free']) ?? 'keep') : 'keep' };
    case 'hello':
      return decodeHello(fields, given);
    case 'events': {
      const from = wholeField(fields[5], GREATEST_EPOCH);
      return given === 1 && from !== undefined ? { word, from } : 'field';
    }
    case 'home': {
      const tag = identifierField(fields[5]);
      return given === 1 && tag !== undefined ? { word, tag } : 'field';
    }
    case 'move':
      return decodeMove(fields, given);
    case 'nudge': {
      const tag = identifierField(fields[5]);
      const steps = positionField(fields[6]);
      return given === 2 && tag !== undefined && steps !== undefined ? { word, tag, steps } : 'field';
    }
    case 'teach':
      return decodeTeach(fields, given);
    default:
      return 'word';
  }
}

function decodeHello(fields: string[], given: number): Order | 'field' {
  const major = wholeField(fields[5], GREATEST_VERSION);
  const minor = wholeField(fields[6], GREATEST_VERSION);
  return given === 2 && major !== undefined && minor !== undefined ? { word: 'hello', major, minor } : 'field';
}

/** SPEC 8.10: `least` lies below `greatest`, and `home` is not above `speed`. */
function decodeTeach(fields: string[], given: number): Order | 'field' {
  const limits = given === 5 ? limitFields(fields, 5) : undefined;
  if (limits === undefined || limits.least >= limits.greatest || limits.home > limits.speed) return 'field';
  return { word: 'teach', ...limits };
}

function decodeMove(fields: string[], given: number): Order | 'field' {
  const tag = identifierField(fields[5]);
  const position = positionField(fields[6]);
  const speed = rateField(fields[7]);
  const acceleration = rateField(fields[8]);
  const beginUs = fields[9] === 'now' ? null : stampField(fields[9]);
  if (
    given !== 5 ||
    tag === undefined ||
    position === undefined ||
    speed === undefined ||
    acceleration === undefined ||
    beginUs === undefined
  )
    return 'field';
  return { word: 'move', tag, position, speed, acceleration, beginUs };
}
