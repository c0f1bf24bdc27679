/** A process that only waits: how late its timers are, ms, told to its parent once a second. What is later than this is not the server's fault. */

const everyMs = 100;
const late: number[] = [];
let dueMs = performance.now() + everyMs;

const wait = (): void =>
  void setTimeout(
    () => {
      late.push(performance.now() - dueMs);
      dueMs += everyMs;
      if (late.length % 10 === 0) process.send?.(late.splice(0));
      wait();
    },
    Math.max(0, dueMs - performance.now()),
  );

process.on('disconnect', () => process.exit(0));
wait();
