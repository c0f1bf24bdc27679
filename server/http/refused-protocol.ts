import { refusalCodeOf } from '@/shared/protocol/finding';
import { ProblemError } from './problem-error';

interface FindingLike {
  code: string;
  path: string | null;
  message: string;
}

/** The refusal of a protocol by what its check found; null where it found nothing. */
export function refusalOf(findings: readonly FindingLike[]): ProblemError | null {
  const first = findings[0];
  if (first === undefined) return null;
  const where = first.path === null ? '' : `Step ${first.path}: `;
  const more = findings.length > 1 ? ` There are ${String(findings.length - 1)} more; each stands under errors.` : '';
  return new ProblemError(
    refusalCodeOf(findings),
    `${where}${first.message}${more}`,
    findings.map((finding) => ({ path: finding.path ?? '', message: finding.message, code: finding.code })),
  );
}
