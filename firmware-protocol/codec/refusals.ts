/** SPEC 12: every refusal has a code for programs and a sentence for people. */
const REFUSALS = {
  word: 'the controller does not know this order',
  field: 'a field of the order is missing, superfluous or out of range',
  epoch: 'another driver has taken the rig',
  session: 'the session has ended: the controller restarted, or another hello came',
  old: 'a later request was carried out already',
  reused: 'this request number was used for another request',
  repeat: 'this order was accepted already',
  busy: 'an order is waiting or in motion',
  stopped: 'a stop ended the motion of this session',
  key: 'the arm key is off; this needs a person at the rig who turns it on',
  lease: 'the motion lease is not live',
  interlock: 'the interlock is open; close it and try again',
  supply: 'the motor supply is absent; release the hard-wired stop or switch the supply on',
  unknown: 'the position is unknown; home first',
  travel: 'the target lies outside the travel limits of the controller, or the nudge is too long',
  speed: 'the speed is above the cap of the controller',
  ramp: 'the acceleration is above the cap of the controller',
  past: 'the time at which the motion should have begun has passed',
  far: 'the time at which the motion should begin is more than 60 s ahead',
  warning: 'a warning of 10 s comes before this motion',
  flag: 'the controller has no home flag',
  gone: 'this event is no longer kept',
  fault: 'the controller found a fault in itself',
} as const;

export type RefusalCode = keyof typeof REFUSALS;

export function refusalWords(code: string): string {
  return Object.hasOwn(REFUSALS, code) ? REFUSALS[code as RefusalCode] : `the controller refused with the code ${code}`;
}
