/**
 * Something to say about a protocol: a refusal (from `check`) or an advice (from `advise`). Programs branch on `code`,
 * people read `message`. `path` is the 1-based path of the step (`2.repeat.1.swing`), the name of a field of the document
 * (`atEnd`), or null where the whole protocol is meant.
 */
export interface Finding {
  code: string;
  path: string | null;
  message: string;
}

/** The findings without those said before at the same place in the same words. */
export function withoutRepeats(findings: readonly Finding[]): Finding[] {
  const seen = new Set<string>();
  return findings.filter(({ code, path, message }) => {
    const key = JSON.stringify([code, path, message]);
    if (seen.has(key)) return false;
    seen.add(key);
    return true;
  });
}

/**
 * The code of a refusal by its findings: `not-yet` where anything in the protocol is not built yet, whatever else is said of it, because no
 * correction would have it accepted.
 */
export const refusalCodeOf = (findings: readonly Pick<Finding, 'code'>[]): 'not-yet' | 'protocol-refused' =>
  findings.some(({ code }) => code === 'not-yet') ? 'not-yet' : 'protocol-refused';
