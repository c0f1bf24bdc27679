import { fork, type ChildProcess } from 'node:child_process';
import { join } from 'node:path';
import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { hex8 } from '@/firmware-protocol/codec';
import { BoardPeer } from './lib/board-peer';
import { report } from './report';

/**
 * 500 timed moves on the emulated board, two other processes taking all the processor they can get: the first edge of the STEP pin against the
 * controller time that was asked for. The host only says when; how late it is itself does not reach the pin.
 */

const moves = 500;
const soonestMs = 150;
const spreadMs = 400;

const burner = (): ChildProcess => fork(join(__dirname, 'lib', 'burner.ts'), [], { execArgv: ['--import', 'tsx'] });

function measure(): number[] {
  const board = new BoardPeer();
  const random = xoroshiro128plus(7);
  const latenessMs: number[] = [];
  for (let number = 0; number < moves; number += 1) {
    const position = number % 2 === 0 ? uniformInt(random, 20, 60) : 0;
    const beginUs = board.controllerUs() + Math.round(1000 * (soonestMs + uniformInt(random, 0, spreadMs * 1000) / 1000));
    const firstUs = board.moveAt({ tag: hex8(100 + number), position, beginUs });
    latenessMs.push(Math.abs(firstUs - beginUs) / 1000);
  }
  return latenessMs;
}

const burners = [burner(), burner()];
try {
  const latenessMs = measure();
  report({
    name: 'timed-start',
    value: Math.max(...latenessMs),
    unit: `ms worst of ${String(moves)}`,
    goal: 0.1,
    want: 'at most',
    peer: null,
  });
} finally {
  for (const one of burners) one.kill();
}
