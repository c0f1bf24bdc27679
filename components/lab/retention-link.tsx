import { useLabQuery } from '@/components/api';
import { keepWords } from '@/components/retention/retention-words';
import { getRetention } from '@/shared/contracts/retention';
import { LabLink } from './lab-link';

/** The way to how long samples are kept. */
export function RetentionLink() {
  const data = useLabQuery(getRetention).data?.data;
  const own = data?.channels.filter(({ rule }) => rule !== null && !rule.asLab).length ?? 0;
  const words = data === undefined ? '…' : `${keepWords(data.lab?.keepDays ?? null)}${own === 0 ? '' : `, ${String(own)} otherwise`}`;
  return <LabLink href="/lab/retention" icon="wait" title="How long samples are kept" words={words} testID="to-retention" />;
}
