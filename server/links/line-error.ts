/** A line that cannot be opened; the message says what was tried, what is wrong and what would be right. */
export class LineError extends Error {
  constructor(
    readonly code: 'missing' | 'not-a-port' | 'another-device' | 'locked' | 'no-permission' | 'unreachable' | 'other-mode' | 'failed',
    message: string,
  ) {
    super(message);
  }
}
