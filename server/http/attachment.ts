import type { Response } from 'express';

/** Words as a part of a file's name, with nothing in it that a file system or a header could misread. */
export const fileWords = (text: string, otherwise: string): string =>
  text
    .toLowerCase()
    .replaceAll(/[^a-z0-9]+/g, '-')
    .replaceAll(/^-|-$/g, '')
    .slice(0, 40) || otherwise;

/** The answer is a file of that name. */
export function attach(res: Response, fileName: string): void {
  res.set('Content-Disposition', `attachment; filename="${fileName}"`);
}
