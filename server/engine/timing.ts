/** Times of the engine, ms. */

/** A move that follows a dwell is sent this long before the dwell ends, with the end as its start time. */
export const LEAD_MS = 1500;
/** With less time left than this a timed start could come too late at the controller: the move is made at once instead. */
export const LEAST_LEAD_MS = 300;
/** A move that begins later than planned by more than this has the outcome `late`. */
export const LATE_MS = 500;
/** A move that was accepted and has not begun this long after its start time never will; more than the 5 s after which a link counts as lost. */
export const BEGIN_GRACE_MS = 8_000;
/** A motion may take this much longer than its profile before the run fails. */
const MOTION_GRACE_MS = 15_000;
/** The same for long motions: the clock of a controller may be that wrong (a ceramic resonator is good to half of it). */
const MOTION_GRACE_SHARE = 0.01;
export const motionGraceMs = (durationMs: number): number => MOTION_GRACE_MS + MOTION_GRACE_SHARE * durationMs;
/** How long hold and stop wait for the controller's word before they are shown as not confirmed. */
export const CONFIRM_MS = 60_000;
/** A controller that has not answered by then never does. */
export const ANSWER_MS = 60_000;
/** The longest interruption after which a run resumes by itself. */
export const GAP_LIMIT_MS = 600_000;
/** A dwell is judged this long before it ends: with the samples that have come by then. */
export const LOOK_LEAD_MS = 3_000;
/** What a step waits for is looked at so often. */
export const LOOK_MS = 10_000;
/** Uncertainty of instants that the server itself stamps, s: the length of one turn of its loop (an estimate, no source). */
export const SERVER_U_S = 0.001;
/** A loop that has not turned for so long is taken for stuck. */
export const LONGEST_BEAT_MS = 1500;
