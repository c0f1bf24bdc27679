import {
  decodeLine,
  encode,
  hex8,
  NO_SESSION,
  type EventMessage,
  type Item,
  type Limits,
  type Order,
  type Reply,
} from '@/firmware-protocol/codec';
import { BoardSession } from '@/server/links/board/board-session';
import type { BoardOptions, Edge } from '@/server/links/board/emulated-board';
import { referenceFirmware } from '@/server/links/board/firmware-file';
import type { Motion } from './pin-oracle';

/** Wide and as quick as the firmware goes. */
export const quickLimits: Limits = { least: -50_000, greatest: 50_000, speed: 8_000_000, acceleration: 20_000_000, home: 400_000 };

/** SPEC 4.2: an answer begins within 50 ms, and is out soon after. */
const ANSWERED_MS = 80;

/** The emulated board spoken to by hand, all its edges recorded. Times in ms from power-on, without a rate error. */
export class BoardBench {
  readonly edges: Edge[] = [];
  readonly events: EventMessage[] = [];
  readonly lines: string[] = [];
  readonly session: BoardSession;
  private id = NO_SESSION;
  private number = 0;
  private tags = 0;
  private nowMs = 0;

  constructor(options: Partial<BoardOptions> = {}, limits: Limits = quickLimits) {
    this.session = new BoardSession(
      { program: referenceFirmware(), startSteps: -40, ratePpm: 0, ...options },
      { onEdge: (edge) => this.edges.push(edge) },
    );
    this.pass(1000);
    this.hello();
    this.ask({ word: 'teach', ...limits });
    this.pass(300);
  }

  get ms(): number {
    return this.nowMs;
  }

  pass(ms: number): void {
    this.nowMs = Math.max(this.nowMs + ms, this.session.msAt(this.session.board.cycle));
    this.hear(this.session.advance(this.nowMs).map(({ text }) => text));
  }

  hello(epoch = 1): void {
    const { body } = this.ask({ word: 'hello', major: 1, minor: 0 }, epoch);
    if (body.word !== 'hi') throw new Error(`hello was answered ${JSON.stringify(body)}`);
    this.id = body.session;
    this.number = 0;
  }

  text(order: Order, epoch = 1): string {
    this.number += 1;
    return encode({ kind: 'request', epoch, session: order.word === 'hello' ? NO_SESSION : this.id, number: this.number, order });
  }

  ask(order: Order, epoch = 1): Reply {
    return this.put(this.text(order, epoch)) as Reply;
  }

  /** Bytes as they are; the reply, if one comes. */
  put(bytes: string): Reply | null {
    const texts = this.session.write(bytes, this.nowMs).map(({ text }) => text);
    this.nowMs = Math.max(this.nowMs, this.session.msAt(this.session.board.cycle));
    this.hear(texts);
    return texts.map(decodeLine).find((item): item is Reply => item.kind === 'reply') ?? null;
  }

  /** Bytes as they are, and all items that come back until the board has had ample time for them. */
  hears(bytes: string): Item[] {
    const before = this.lines.length;
    this.put(bytes);
    const { board, lastArrivedCycle } = this.session;
    this.pass(Math.max(0, this.session.msAt(lastArrivedCycle) - this.session.msAt(board.cycle)) + ANSWERED_MS);
    return this.lines.slice(before).map(decodeLine);
  }

  /** Everything as it is now, to go back to. */
  keep(): () => void {
    const { id, number, tags } = this;
    const state = this.session.board.state();
    return () => {
      this.session.board.restore(state);
      this.session.begin(this.nowMs);
      Object.assign(this, { id, number, tags });
    };
  }

  nextTag(): string {
    this.tags += 1;
    return hex8(this.tags);
  }

  /** Orders a motion, keeps the lease live, and lets `meanwhile` do something after a time, if the motion lasts so long. */
  motion(order: Extract<Order, { word: 'move' | 'home' }>, meanwhile?: { afterMs: number; act: () => void }): EventMessage {
    this.ask({ word: 'renew' });
    const { body } = this.ask(order);
    if (body.word !== 'ok') throw new Error(`${order.word} was refused: ${JSON.stringify(body)}`);
    let acted = meanwhile === undefined;
    const actMs = this.nowMs + (meanwhile?.afterMs ?? 0);
    for (let turns = 0; turns < 400; turns += 1) {
      const ended = this.events.find(({ what }) => what.word === 'ended' && what.tag === order.tag);
      if (ended !== undefined) return ended;
      if (acted) {
        this.pass(500);
        this.ask({ word: 'renew' });
      } else {
        this.pass(Math.min(500, Math.max(1, actMs - this.nowMs)));
        if (this.nowMs >= actMs && (acted = true)) meanwhile?.act();
        else this.ask({ word: 'renew' });
      }
    }
    throw new Error(`${order.word} never ended`);
  }

  home(): void {
    this.motion({ word: 'home', tag: this.nextTag() });
  }

  /** A move and all that its pins did. */
  move(
    { to, speed, acceleration }: { to: number; speed: number; acceleration: number },
    meanwhile?: { afterMs: number; act: () => void },
  ): Motion {
    const { table } = this.session.board;
    const from = table.track.at(Infinity);
    const { direction: directionBefore, enable: enableBefore } = this.levels();
    this.edges.length = 0;
    const order = {
      word: 'move',
      tag: this.nextTag(),
      position: to,
      speed: speed * 1000,
      acceleration: acceleration * 1000,
      beginUs: null,
    } as const;
    const { what } = this.motion(order, meanwhile);
    if (what.word !== 'ended' || what.position === null) throw new Error(`it ended ${JSON.stringify(what)}`);
    this.pass(1);
    return {
      edges: [...this.edges],
      ...{ directionBefore, enableBefore, from, speed, acceleration },
      target: what.cause === 'done' ? to : null,
      reportedEnd: what.position,
      placeEnd: table.track.at(Infinity),
      steepest: what.cause === 'done' ? acceleration : Math.max(acceleration, quickLimits.acceleration / 1000),
    };
  }

  private levels() {
    const { board } = this.session;
    return { direction: board.output('direction'), enable: board.output('enable') };
  }

  private hear(texts: readonly string[]): void {
    this.lines.push(...texts);
    for (const item of texts.map(decodeLine)) if (item.kind === 'event') this.events.push(item);
  }
}
