/** Words for the person at the terminal. Everything goes to stderr, so that stdout stays for results. */
export function say(text) {
  process.stderr.write(`${text}\n`);
}

/** Says what is being waited for once it has taken two seconds, and how long it took in the end. */
export async function waiting(what, work) {
  const start = Date.now();
  let told = false;
  const timer = setTimeout(() => {
    told = true;
    say(`… ${what}`);
  }, 2000);
  const again = setInterval(() => say(`… still ${what} (${Math.round((Date.now() - start) / 1000)} s)`), 20000);
  try {
    return await work();
  } finally {
    clearTimeout(timer);
    clearInterval(again);
    if (told) say(`  done in ${((Date.now() - start) / 1000).toFixed(1)} s`);
  }
}

/** Ends the process with a sentence that says what is wrong and what would help. */
export function giveUp(text) {
  say(text);
  process.exit(1);
}
