import type { BoardDeed, BoardLine } from '../links/board/board-session';

/** Between the server's thread and that of an emulated board. Instants are ms of the machine's monotonic clock (see `MachineTime`). */
export type ToBoard = { kind: 'write'; bytes: string; atMs: number } | { kind: 'do'; deed: BoardDeed };
export type FromBoard = { kind: 'lines'; lines: BoardLine[] } | { kind: 'steps'; steps: { time: number; place: number }[] };
