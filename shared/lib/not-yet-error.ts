/** Something the formats allow and this version does not do yet. Commands end with exit code 2, routes with the problem `not-yet`. */
export class NotYetError extends Error {
  readonly code = 'not-yet';
}
