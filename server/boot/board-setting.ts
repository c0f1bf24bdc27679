import type { RigMotion } from '@/shared/rig/document';
import { commissionedSession } from '../links/board/board-controller';
import { BoardSession } from '../links/board/board-session';
import { referenceFirmware } from '../links/board/firmware-file';
import { stepsOfDeg } from '../links/rig-units';
import type { BoardMemory } from './board-memory';
import type { Clock } from '../interfaces/clock';

/** What an emulated board is made from. */
export interface BoardSetting {
  rig: RigMotion;
  /** Of what its memory holds after power-on; another one at each first start. */
  seed: number;
  /** Where it is kept on disk; null: nowhere. */
  file: string | null;
}

/** Longer than a restart takes: after that the board counts as switched off meanwhile. */
const LONGEST_AWAY_MS = 15 * 60_000;

/**
 * The board as it goes on now: as it was left, if that is not long ago; switched on again with what its EEPROM keeps, else; and the first
 * time new, with the rig's limits taught, its position unknown. `presentMs`: the instant that its present is, before it catches up.
 */
export function newBoard(
  { rig, seed }: BoardSetting,
  { clock, memory }: { clock: Clock; memory: BoardMemory | null },
): { session: BoardSession; presentMs: number } {
  const program = referenceFirmware();
  const nowMs = clock.monotonicMs();
  const before = memory?.load(program) ?? null;
  if (before === null) {
    const session = commissionedSession({ rig, homed: false, startSteps: stepsOfDeg(rig, rig.homeDeg) }, { seed });
    return { session, presentMs: nowMs };
  }
  const { state, atUtcMs } = before.saved;
  const session = new BoardSession({ program, seed, eeprom: state.eeprom.cells, startSteps: state.table.place });
  const awayMs = clock.utcMs() - atUtcMs;
  if (!before.sameProgram || awayMs < 0 || awayMs > LONGEST_AWAY_MS) return { session, presentMs: nowMs };
  session.board.restore(state);
  return { session, presentMs: nowMs - awayMs };
}
