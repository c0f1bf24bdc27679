import symbols from '@/firmware-protocol/firmware/evenfall.symbols.json';
import type { BoardBench } from '@/scripts/soak/board/board-bench';

type Variable = keyof typeof symbols;

/** The firmware's own variables in the emulated board's memory, by their names in its sources: for what would take months to come about. */
export class BoardRam {
  constructor(private readonly bench: BoardBench) {}

  read(variable: Variable, bytes: number): number {
    const at = symbols[variable];
    return [...this.data.slice(at, at + bytes)].reduce((sum, byte, index) => sum + byte * 256 ** index, 0);
  }

  write(variable: Variable, bytes: number, value: number): void {
    const at = symbols[variable];
    for (let index = 0; index < bytes; index += 1) this.data[at + index] = Math.floor(value / 256 ** index) % 256;
  }

  private get data(): Uint8Array {
    return this.bench.session.board.core.cpu.data;
  }
}
