import { crc16, hex4 } from './crc';
import type { EventMessage, Happening, Limits, Message, Order, Reply, ReplyBody, Request } from './messages';

/** The line of a message, check word and line feed included (SPEC 1.2). Values must lie in the ranges of SPEC 2. */
export function encode(message: Message): string {
  const body = message.kind === 'request' ? requestBody(message) : message.kind === 'reply' ? replyText(message) : eventText(message);
  return seal(body);
}

/** Adds the check word and the line feed to a body. */
function seal(body: string): string {
  return `${body} ${hex4(crc16(body))}\n`;
}

/** A controller time as a stamp of 16 bytes (SPEC 2.3). */
function stamp(us: number): string {
  const seconds = Math.floor(us / 1_000_000);
  const rest = us - seconds * 1_000_000;
  return `${String(1_000_000_000 + seconds).slice(1)}.${String(1_000_000 + rest).slice(1)}`;
}

function requestBody(request: Request): string {
  return `q ${request.epoch} ${request.session} ${request.number} ${orderText(request.order)}`;
}

function orderText(order: Order): string {
  switch (order.word) {
    case 'hello':
      return `hello ${order.major} ${order.minor}`;
    case 'events':
      return `events ${order.from}`;
    case 'home':
      return `home ${order.tag}`;
    case 'move':
      return `move ${order.tag} ${order.position} ${order.speed} ${order.acceleration} ${order.beginUs === null ? 'now' : stamp(order.beginUs)}`;
    case 'nudge':
      return `nudge ${order.tag} ${order.steps}`;
    case 'teach':
      return `teach ${limitsText(order)}`;
    case 'stop':
      return `stop ${order.drivers}`;
    default:
      return order.word;
  }
}

function replyText(reply: Reply): string {
  const turn = String(1_000_000 + Math.min(999_999, reply.turnUs)).slice(1);
  return `r ${reply.session} ${reply.number} ${stamp(reply.receivedUs)} ${turn} ${bodyText(reply.body)}`;
}

const limitsText = ({ least, greatest, speed, acceleration, home }: Limits) => `${least} ${greatest} ${speed} ${acceleration} ${home}`;

const place = (position: number | null) => (position === null ? 'none' : String(position));

function bodyText(body: ReplyBody): string {
  switch (body.word) {
    case 'ok':
      return `ok ${body.state} ${place(body.position)} ${hex4(body.flags).slice(1)} ${body.event} ${body.dropped}`;
    case 'hi':
      return `hi ${body.major}.${body.minor} ${body.boot} ${body.session} ${body.resolutionUs} ${hex4(body.capabilities)} ${body.firmware}`;
    case 'lim':
      return `lim ${limitsText(body)}`;
    case 'no':
      return `no ${body.code} ${body.detail}`;
  }
}

function eventText(event: EventMessage): string {
  return `e ${event.number} ${stamp(event.atUs)} ${happeningText(event.what)}`;
}

function happeningText(what: Happening): string {
  switch (what.word) {
    case 'boot':
      return `boot ${what.cause}`;
    case 'warn':
      return `warn ${what.tag}`;
    case 'began':
    case 'homed':
      return `${what.word} ${what.tag} ${place(what.position)}`;
    case 'ended':
      return `ended ${what.tag} ${place(what.position)} ${what.cause}`;
    case 'edge':
      return `edge ${place(what.position)} ${what.direction}`;
    case 'interlock':
      return `interlock ${what.closed ? 'closed' : 'open'}`;
    case 'supply':
      return `supply ${what.present ? 'present' : 'lost'}`;
    case 'key':
      return `key ${what.on ? 'on' : 'off'}`;
    case 'lease':
    case 'limit':
      return `${what.word} ${place(what.position)}`;
    case 'other':
      return what.name;
  }
}
