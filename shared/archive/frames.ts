import { endingOf, type PictureType } from '../camera/picture';
import type { FrameMoment } from '../contracts/cameras';
import { csvLine, textCell } from './csv-text';
import { formatInstant } from './instants';

export const framesFile = 'frames/frames.csv';
export const frameColumns = ['seq', 'moment', 'at_utc', 'camera', 'taken_utc', 'u_taken_s', 'path', 'note'] as const;

/** What a camera saw at a moment of the run. No evaluation reads it. */
export interface ArchivedFrame {
  /** Row of steps.csv. */
  seq: number;
  moment: FrameMoment;
  atUtcMs: number;
  camera: string;
  picture: { bytes: Uint8Array; type: PictureType; takenUtcMs: number; uTakenS: number } | null;
  /** Why there is no picture; empty where there is one. */
  note: string;
}

/** Numbered in the order of the table. */
const pathOf = ({ seq, moment, picture }: ArchivedFrame, index: number): string =>
  picture === null ? '' : `frames/${String(index + 1).padStart(4, '0')}-row-${String(seq)}-${moment}.${endingOf(picture.type)}`;

export function framesCsv(frames: readonly ArchivedFrame[]): string {
  const lines = frames.map((frame, index) => {
    const { seq, moment, atUtcMs, camera, picture, note } = frame;
    const taken = picture === null ? ['', ''] : [formatInstant(picture.takenUtcMs), String(picture.uTakenS)];
    return csvLine([String(seq), moment, formatInstant(atUtcMs), textCell(camera), ...taken, pathOf(frame, index), textCell(note)]);
  });
  return csvLine(frameColumns) + lines.join('');
}

/** The pictures as files of the archive. */
export function frameFiles(frames: readonly ArchivedFrame[]): { path: string; bytes: Uint8Array; facts: Record<string, unknown> }[] {
  return frames.flatMap((frame, index) => {
    const { picture } = frame;
    if (picture === null) return [];
    const facts = { name: `frame-${String(index + 1)}`, format: endingOf(picture.type), mediatype: picture.type };
    return [{ path: pathOf(frame, index), bytes: picture.bytes, facts }];
  });
}
