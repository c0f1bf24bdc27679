import { decodeLine, encode, NO_SESSION, type Order, type Reply } from '@/firmware-protocol/codec';
import { CYCLES_PER_US } from '@/server/links/board/avr-core';
import { commissionedSession } from '@/server/links/board/board-controller';
import type { BoardSession } from '@/server/links/board/board-session';
import { demoRigWide } from '@/shared/rig/demo-rigs';

const rig = demoRigWide.motion as NonNullable<typeof demoRigWide.motion>;
const speed = 200_000;
const acceleration = 80_000;

/** Speaks to an emulated board by hand and looks at its STEP pin; controller times in µs. */
export class BoardPeer {
  private readonly board: BoardSession;
  private readonly rises: number[] = [];
  private id = NO_SESSION;
  private number = 0;
  private nowMs: number;
  /** The cycle at which the controller's clock was 0, from the line feed of a request and the stamp of its receipt. */
  private zeroCycle = 0;

  constructor() {
    this.board = commissionedSession(
      { rig, homed: true, startSteps: 0 },
      { ratePpm: 0 },
      { onEdge: ({ pin, level, cycle }) => void (pin === 'step' && level && this.rises.push(cycle)) },
    );
    this.nowMs = this.board.msAt(this.board.board.cycle);
    const { body } = this.ask({ word: 'hello', major: 1, minor: 0 });
    if (body.word !== 'hi') throw new Error(`hello was answered ${JSON.stringify(body)}`);
    this.id = body.session;
  }

  controllerUs(): number {
    return Math.round((this.board.board.cycle - this.zeroCycle) / CYCLES_PER_US);
  }

  /** Orders the move, lets it happen, and gives the controller time of its first edge. */
  moveAt({ tag, position, beginUs }: { tag: string; position: number; beginUs: number }): number {
    this.ask({ word: 'renew' });
    const { body } = this.ask({ word: 'move', tag, position, speed, acceleration, beginUs });
    if (body.word !== 'ok') throw new Error(`the move was answered ${JSON.stringify(body)}`);
    this.rises.length = 0;
    for (let state = 'waiting'; state !== 'rest';) {
      this.nowMs += 200;
      this.board.advance(this.nowMs);
      const { body: told } = this.ask({ word: 'renew' });
      state = told.word === 'ok' ? told.state : 'lost';
      if (state === 'lost') throw new Error(`renew was answered ${JSON.stringify(told)}`);
    }
    const first = this.rises[0];
    if (first === undefined) throw new Error(`the move ${tag} made no step`);
    return (first - this.zeroCycle) / CYCLES_PER_US;
  }

  private ask(order: Order): Reply {
    this.number += 1;
    const text = encode({ kind: 'request', epoch: 1, session: this.id, number: this.number, order });
    const before = this.board.board.cycle;
    const lines = this.board.write(text, this.nowMs);
    const arrived = Math.max(before, this.board.lastArrivedCycle);
    this.nowMs = Math.max(this.nowMs, this.board.msAt(this.board.board.cycle));
    const reply = lines.map((line) => decodeLine(line.text)).find((item): item is Reply => item.kind === 'reply');
    if (reply === undefined) throw new Error(`no answer to ${order.word}`);
    if (this.zeroCycle === 0) this.zeroCycle = arrived - reply.receivedUs * CYCLES_PER_US;
    return reply;
  }
}
