/**
 * Required before a server of a soak begins (`NODE_OPTIONS`): its wall clock goes 60 s ahead at SIGUSR2 and 60 s back at SIGHUP, as if somebody set the clock of that
 * machine alone. Monotonic time and the clocks of all other processes stay.
 */
const RealDate = Date;
let aheadMs = 0;
const now = () => RealDate.now() + aheadMs;

globalThis.Date = new Proxy(RealDate, {
  construct: (target, parts, made) => Reflect.construct(target, parts.length === 0 ? [now()] : parts, made),
  get: (target, name) => (name === 'now' ? now : Reflect.get(target, name)),
});

process.on('SIGUSR2', () => {
  aheadMs += 60_000;
});
process.on('SIGHUP', () => {
  aheadMs -= 60_000;
});
