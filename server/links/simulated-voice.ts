import { encode, EVENTS_AT_ONCE, type Happening, type ReplyBody } from '@/firmware-protocol/codec';
import { EventRing } from './simulated-events';
import type { SimulatedStart } from './simulated-start';

/** From a request's line feed to its reply, µs. */
const TURN_US = 92;

/** What the simulated controller says, and when: replies, and events as they happen or again. */
export class SimulatedVoice {
  readonly ring = new EventRing();

  constructor(
    private readonly start: SimulatedStart,
    private readonly send: (line: string, atUs: number) => void,
  ) {}

  /** Sends a reply and gives its line. */
  answer({ session, number }: { session: string; number: number }, body: ReplyBody, us: number): string {
    const reply = encode({ kind: 'reply', session, number, receivedUs: this.start.stampUs(us), turnUs: TURN_US, body });
    this.repeat(reply, us);
    return reply;
  }

  repeat(reply: string, us: number): void {
    this.send(reply, us + TURN_US);
  }

  happen(what: Happening, us: number): void {
    this.send(encode(this.ring.note(what, this.start.stampUs(us))), us);
  }

  sendAgain(from: number, us: number): void {
    for (const event of this.ring.from(from, EVENTS_AT_ONCE)) this.repeat(encode(event), us);
  }
}
