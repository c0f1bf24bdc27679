export { callOnce } from './call-once';
export { addressOf, call, newIdempotencyKey, type CallInput, type CallResult } from './client';
export { useConnection } from './connection';
export { deviceNowMs, hearServerTime, monotonicMs, serverNowIso, serverNowMs } from './device-clock';
export { ApiProblem, ApiUnreachable, fieldErrors, isProblem, Unanswered, wordsOf } from './problem';
export { ApiProvider } from './provider';
export { labKey, useLabCall, useLabMutation, useLabOnce, useLabQuery } from './queries';
export { useLab, useMay, useSession } from './session';
