import { decodeLine, encode, FLAG, hex8, NO_SESSION, PROTOCOL_VERSION, type Order, type Reply } from '@/firmware-protocol/codec';
import type { RigMotion } from '@/shared/rig/document';
import { teachRefusal } from '../link-words';
import { limitsOf } from '../rig-units';
import { CPU_HZ } from './avr-core';
import type { BoardSession } from './board-session';

/** Of the motions that bring a board to its place: a driver that reads the ring from its oldest event hears of them. */
export const COMMISSION_TAGS = [hex8(1), hex8(2)] as const;

/** SPEC 13: a start takes at most 1 s. */
const START_S = 1;
/** The lease of 2 s is renewed well before it lapses. */
const RENEW_MS = 1000;
/** Homing at the slowest, with the warning before it. */
const LONGEST_S = 600;

/**
 * What a keeper does once with a new board, in the board's own time before the host's begins: teach it the rig's limits, and, where
 * the position is to be known, home it and turn it to its place.
 */
export function commission(session: BoardSession, rig: RigMotion, { homedAt }: { homedAt: number | null }): void {
  const keeper = new Keeper(session);
  keeper.pass(START_S * 1000);
  const hi = keeper.ask({ word: 'hello', ...PROTOCOL_VERSION });
  if (hi.body.word !== 'hi') throw new Error(`the emulated board does not greet: ${JSON.stringify(hi.body)}`);
  keeper.session = hi.body.session;
  const lesson = keeper.put({ word: 'teach', ...limitsOf(rig) });
  if (lesson.body.word === 'no') throw new BeyondFirmware(teachRefusal(rig, lesson.body).message);
  if (homedAt === null) return;
  keeper.turn({ word: 'home', tag: COMMISSION_TAGS[0] });
  const { speed, acceleration } = limitsOf(rig);
  if (homedAt !== 0) keeper.turn({ word: 'move', tag: COMMISSION_TAGS[1], position: homedAt, speed, acceleration, beginUs: null });
}

/** The rig asks for more than the firmware can do; the message says what, and what the most is. */
export class BeyondFirmware extends Error {}

class Keeper {
  session = NO_SESSION;
  private number = 0;
  private nowMs: number;

  constructor(private readonly bench: BoardSession) {
    this.nowMs = bench.msAt(bench.board.cycle);
  }

  pass(ms: number): void {
    this.nowMs += ms;
    this.bench.advance(this.nowMs);
  }

  /** @throws Error when it is refused: a keeper would not go on either */
  ask(order: Order): Reply {
    const reply = this.put(order);
    if (reply.body.word === 'no') throw new Error(`the emulated board refuses ${order.word}: ${reply.body.code} ${reply.body.detail}`);
    return reply;
  }

  put(order: Order): Reply {
    this.number += 1;
    const { number, session } = this;
    const lines = this.bench.write(encode({ kind: 'request', epoch: 0, session, number, order }), this.nowMs);
    this.nowMs = Math.max(this.nowMs, this.bench.msAt(this.bench.board.cycle));
    const reply = lines.map(({ text }) => decodeLine(text)).find((item): item is Reply => item.kind === 'reply');
    if (reply === undefined) throw new Error(`the emulated board did not answer ${order.word}`);
    return reply;
  }

  /** A motion to its end, or nothing of the kind within ten minutes. */
  turn(order: Order): void {
    this.ask({ word: 'renew' });
    this.ask(order);
    const endCycle = this.bench.board.cycle + LONGEST_S * CPU_HZ;
    for (;;) {
      this.pass(RENEW_MS);
      const { body } = this.ask({ word: 'renew' });
      if (body.word === 'ok' && body.state === 'rest' && (body.flags & FLAG.positionKnown) !== 0) return;
      if (this.bench.board.cycle > endCycle) throw new Error(`the emulated board does not come to the end of ${order.word}`);
    }
  }
}
