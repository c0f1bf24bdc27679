import { useMay } from '@/components/api';
import { LabLink } from './lab-link';

/** For owners: the way to all that people did. */
export function AuditLink() {
  if (!useMay('members.manage').ok) return null;
  return <LabLink href="/lab/audit" icon="document" title="Audit" words="what people did" testID="to-audit" />;
}
