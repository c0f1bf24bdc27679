import { decodeLine } from '@/firmware-protocol/codec';
import { BoardBench } from '../board/board-bench';
import type { SeededKinds } from '../seeded/try-seeds';
import { almostLines, asRead } from './almost-lines';
import { readByFirmware } from './firmware-host';

const AT_ONCE = 100_000;
const ON_BOARD = 100;

/** Lines that the firmware's core, as built for this machine, reads otherwise than the codec does. */
export function misread(lines: readonly string[]): string[] {
  const byFirmware = readByFirmware(lines.map((line) => `${line}\n`));
  return lines.flatMap((line, index) => {
    const read = byFirmware[index] ?? [];
    return read.join() === asRead(decodeLine(line)).join() ? [] : [`${JSON.stringify(line)} is read as ${JSON.stringify(read)}`];
  });
}

/** Lines that the emulated board answers where the codec expects no answer, or the other way round; and whether its STEP pin rested. */
function misansweredByBoard(lines: readonly string[]): string[] {
  const bench = new BoardBench();
  bench.edges.length = 0;
  const wrong = lines.flatMap((line) => {
    const replies = bench.hears(`${line}\n`).filter(({ kind }) => kind === 'reply').length;
    const wanted = Number(['request', 'unusable'].includes(decodeLine(line).kind));
    return replies === wanted ? [] : [`${JSON.stringify(line)} got ${replies} answers from the board`];
  });
  return bench.edges.some(({ pin }) => pin === 'step') ? [...wrong, 'the STEP pin of the board did not rest'] : wrong;
}

function tryLines(seed: number): string[] {
  const lines = [...almostLines(AT_ONCE, seed)];
  const some = lines.filter((_, index) => index % ON_BOARD === 0);
  return [...misread(lines), ...misansweredByBoard(some)].map((words) => `seed ${seed}: ${words}`);
}

/** A hundred thousand lines at once: 10⁶, or 10⁷ as the second figure. Every hundredth also goes to the board. */
export const lineKinds: SeededKinds = { lines: { attempt: tryLines, first: 10, second: 100 } };
