import {
  choiceField,
  GREATEST_EPOCH,
  GREATEST_NUMBER,
  hexNumberField,
  identifierField,
  limitFields,
  placeField,
  positionField,
  stampField,
  turnField,
  wholeField,
} from './fields';
import { STATES, type HiBody, type LimitsBody, type NoBody, type OkBody, type Reply, type ReplyBody } from './messages';

/** SPEC 5. Further fields at the end belong to a later minor version and are ignored (2.5). */
export function decodeReply(fields: string[]): Reply | undefined {
  const session = identifierField(fields[1]);
  const number = wholeField(fields[2], GREATEST_NUMBER);
  const receivedUs = stampField(fields[3]);
  const turnUs = turnField(fields[4]);
  const body = decodeBody(fields);
  if (session === undefined || number === undefined || receivedUs === undefined || turnUs === undefined || body === undefined)
    return undefined;
  return { kind: 'reply', session, number, receivedUs, turnUs, body };
}

function decodeBody(fields: string[]): ReplyBody | undefined {
  switch (fields[5]) {
    case 'ok':
      return decodeOk(fields);
    case 'no':
      return decodeNo(fields);
    case 'hi':
      return decodeHi(fields);
    case 'lim':
      return decodeLimits(fields);
    default:
      return undefined;
  }
}

function decodeOk(fields: string[]): OkBody | undefined {
  const state = choiceField(fields[6], STATES);
  const position = placeField(fields[7]);
  const flags = hexNumberField(fields[8], 3);
  const event = wholeField(fields[9], GREATEST_EPOCH);
  const dropped = wholeField(fields[10], GREATEST_NUMBER);
  if (state === undefined || position === undefined || flags === undefined || event === undefined || dropped === undefined)
    return undefined;
  return { word: 'ok', state, position, flags, event, dropped };
}

function decodeNo(fields: string[]): NoBody | undefined {
  const code = fields[6];
  const detail = detailField(fields[7]);
  return code === undefined || !/^[a-z]+$/.test(code) || detail === undefined ? undefined : { word: 'no', code, detail };
}

/** A limit may be negative, an epoch may need ten digits. */
const detailField = (text: string | undefined) => wholeField(text, GREATEST_EPOCH) ?? positionField(text);

function decodeHi(fields: string[]): HiBody | undefined {
  const [majorText, minorText, ...more] = (fields[6] ?? '').split('.');
  const major = wholeField(majorText, 99);
  const minor = wholeField(minorText, 99);
  const boot = identifierField(fields[7]);
  const session = identifierField(fields[8]);
  const resolutionUs = wholeField(fields[9], 9999);
  const capabilities = hexNumberField(fields[10], 4);
  const firmware = fields[11];
  if (major === undefined || minor === undefined || more.length > 0 || boot === undefined || session === undefined) return undefined;
  if (
    resolutionUs === undefined ||
    resolutionUs === 0 ||
    capabilities === undefined ||
    firmware === undefined ||
    !/^[a-z0-9.-]{1,12}$/.test(firmware)
  )
    return undefined;
  return { word: 'hi', major, minor, boot, session, resolutionUs, capabilities, firmware };
}

function decodeLimits(fields: string[]): LimitsBody | undefined {
  const limits = limitFields(fields, 6);
  return limits === undefined ? undefined : { word: 'lim', ...limits };
}
