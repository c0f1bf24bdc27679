import { decodeLine, encode, type Order } from '@/firmware-protocol/codec';

/** Reasons of a controller's own, as SPEC 12 has them, for an order to move; `tired` is one of a later minor version (12.1). */
const FOR_MOTIONS = [
  ...['word', 'field', 'session', 'epoch', 'old', 'busy', 'stopped', 'key', 'lease', 'interlock', 'supply', 'unknown', 'travel'],
  ...['speed', 'ramp', 'past', 'far', 'warning', 'flag', 'fault', 'tired'],
];
const FOR_QUESTIONS = ['word', 'field', 'session', 'epoch', 'old', 'fault', 'tired'];

const codesFor: Partial<Record<Order['word'], readonly string[]>> = {
  home: FOR_MOTIONS,
  move: FOR_MOTIONS,
  nudge: FOR_MOTIONS,
  renew: FOR_QUESTIONS,
  status: FOR_QUESTIONS,
  limits: FOR_QUESTIONS,
  events: FOR_QUESTIONS,
};

/**
 * A controller that refuses what it was asked, for any reason: in the place of the request it gets one that changes nothing, and its answer reaches the driver as
 * a refusal with the stamps of that answer. Greetings and stops are never refused so (SPEC 4.1, 9.4).
 */
export class Refusals {
  private readonly codes = new Map<string, string>();

  constructor(private readonly upTo: (greatest: number) => number) {}

  /** What reaches the controller in the place of a request. */
  askedInstead(line: string): string {
    const request = decodeLine(line);
    const codes = request.kind === 'request' ? codesFor[request.order.word] : undefined;
    if (request.kind !== 'request' || codes === undefined) return line;
    this.codes.set(keyOf(request), codes[this.upTo(codes.length - 1)] as string);
    return encode({ ...request, order: { word: 'status' } }).slice(0, -1);
  }

  /** What reaches the driver in the place of its answer. */
  answeredInstead(line: string): string {
    if (this.codes.size === 0 || !line.startsWith('r ')) return line;
    const reply = decodeLine(line);
    const code = reply.kind === 'reply' && reply.body.word === 'ok' ? this.codes.get(keyOf(reply)) : undefined;
    return reply.kind !== 'reply' || code === undefined ? line : encode({ ...reply, body: { word: 'no', code, detail: 0 } }).slice(0, -1);
  }
}

const keyOf = ({ session, number }: { session: string; number: number }) => `${session} ${number}`;
