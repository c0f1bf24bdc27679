/** Whether a time of day `HH:MM` lies in hours that may pass midnight; their end is not part of them. */
export function isWithinHours({ from, until }: { from: string; until: string }, clock: string): boolean {
  return from < until ? clock >= from && clock < until : clock >= from || clock < until;
}
