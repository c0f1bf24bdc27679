import { decodeLine } from '@/firmware-protocol/codec';
import { BoardBench } from './board/board-bench';
import { almostLines, asRead } from './fuzz/almost-lines';
import { readByFirmware } from './fuzz/firmware-host';
import { soak } from './report';

/**
 * Lines between right and wrong, read by the codec and by the firmware's core as built for this machine, which must agree: 10⁶, or 10⁷ as
 * the second figure. Every hundredth also goes to the emulated board, whose answers must be those that the codec expects and whose STEP pin must rest.
 */
const FIRST = 1_000_000;
const SECOND = 10_000_000;
const AT_ONCE = 100_000;
const SEED = 20_260_601;
const ON_BOARD = 100;
const KEPT_VIOLATIONS = 20;

const isAnswered = (line: string) => ['request', 'unusable'].includes(decodeLine(line).kind);

soak('fuzz', (args) => {
  const lines = args.includes('--second') ? SECOND : FIRST;
  const bench = new BoardBench();
  bench.edges.length = 0;
  const violations: string[] = [];
  const note = (words: string) => violations.length < KEPT_VIOLATIONS && violations.push(words);
  const read: Record<string, number> = {};
  let onBoard = 0;
  let made = 0;
  for (let seed = SEED; made < lines; seed += 1) {
    const some = [...almostLines(AT_ONCE, seed)];
    const byFirmware = readByFirmware(some.map((line) => `${line}\n`));
    some.forEach((line, index) => {
      const item = decodeLine(line);
      read[item.kind] = (read[item.kind] ?? 0) + 1;
      if ((byFirmware[index] ?? []).join() !== asRead(item).join())
        note(`seed ${seed}, line ${index}: ${JSON.stringify(line)} is read as ${JSON.stringify(byFirmware[index])}`);
      if (index % ON_BOARD !== 0) return;
      onBoard += 1;
      const replies = bench.hears(`${line}\n`).filter(({ kind }) => kind === 'reply').length;
      if (replies !== Number(isAnswered(line)))
        note(`seed ${seed}, line ${index}: ${JSON.stringify(line)} got ${replies} answers from the board`);
    });
    made += some.length;
    process.stderr.write(`${made} lines, ${violations.length} violations so far\n`);
  }
  if (bench.edges.some(({ pin }) => pin === 'step')) note('the STEP pin of the board did not rest');
  return { ok: violations.length === 0, lines: made, read, onBoard, firstSeed: SEED, violations };
});
