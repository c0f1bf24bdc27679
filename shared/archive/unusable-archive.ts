/** Why an archive cannot be evaluated, with the place. The message is a whole sentence for people. */
export class UnusableArchive extends Error {
  readonly code = 'unusable-archive';
  /** File inside the archive; null when it is about the archive itself. */
  readonly file: string | null;
  /** Line of the file, counted from 1 with the header, as an editor shows it. */
  readonly row: number | null;
  /** The reason without the place. */
  readonly why: string;

  constructor(place: { file: string | null; row?: number; column?: string }, why: string) {
    const parts = [
      place.file,
      place.row === undefined ? null : `row ${place.row}`,
      place.column === undefined ? null : `column ${place.column}`,
    ];
    const where = parts.filter((part) => part !== null).join(', ');
    super(where === '' ? why : `${where}: ${why}`);
    this.why = why;
    this.file = place.file;
    this.row = place.row ?? null;
  }
}

/** What is wrong with a document, in words: the first of the issues, and how many more there are. */
export function firstIssue({ issues }: { issues: readonly { path: readonly PropertyKey[]; message: string }[] }): string {
  const [issue] = issues;
  if (issue === undefined) return 'not as the format has it';
  const more = issues.length > 1 ? ` (and ${issues.length - 1} more)` : '';
  return `${issue.path.length === 0 ? '' : `${issue.path.join('.')}: `}${issue.message}${more}`;
}
