/** Takes a processor for itself until it is ended, or its parent has gone. */
function burn(): void {
  const until = performance.now() + 200;
  while (performance.now() < until) Math.sqrt(until);
  if (process.connected) setImmediate(burn);
}

burn();
