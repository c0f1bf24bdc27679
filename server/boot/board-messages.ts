import type { BoardDeed, BoardLine } from '../links/board/board-session';
import type { RealClock } from './real-clock';

/** Between the server's thread and that of an emulated board. Instants are ms of the machine's monotonic clock, which all threads share. */
export type ToBoard = { kind: 'write'; bytes: string; atMs: number } | { kind: 'do'; deed: BoardDeed };
export type FromBoard = { kind: 'lines'; lines: BoardLine[] } | { kind: 'steps'; steps: { time: number; place: number }[] };

/** The machine's monotonic clock less that of this thread, ms. */
export const machineAheadMs = (clock: RealClock) => Number(process.hrtime.bigint()) / 1e6 - clock.monotonicMs();
