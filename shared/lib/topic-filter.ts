/** Topics of MQTT 3.1.1 (OASIS standard, section 4.7). */

/** What is wrong with a topic filter; null where nothing is. */
export function filterProblem(filter: string): string | null {
  if (filter === '') return 'a topic of at least one character';
  if (filter.includes('\0')) return 'a topic without the character NUL';
  const levels = filter.split('/');
  if (levels.some((level, index) => level.includes('#') && (level !== '#' || index < levels.length - 1)))
    return '# alone as the last level, as in lab/box/#';
  return levels.some((level) => level.includes('+') && level !== '+') ? '+ alone in its level, as in lab/+/temperature' : null;
}

/** Whether a message under this topic is one of the filter's. Topics that begin with $ belong to the broker: no wildcard takes them. */
export function matchesTopic(filter: string, topic: string): boolean {
  if (topic.startsWith('$') && /^[+#]/.test(filter)) return false;
  const [wanted, levels] = [filter.split('/'), topic.split('/')];
  if (wanted.at(-1) === '#') {
    const before = wanted.slice(0, -1);
    return levels.length >= before.length && before.every((level, index) => level === '+' || level === levels[index]);
  }
  return wanted.length === levels.length && wanted.every((level, index) => level === '+' || level === levels[index]);
}
