import { Link, type Href } from 'expo-router';
import { useMay } from '@/components/api';
import { Body, Icon, Label } from '@/components/ui';

/** For owners: the way to all that people did. */
export function AuditLink() {
  if (!useMay('members.manage').ok) return null;
  return (
    <Link
      href={'/lab/audit' as Href}
      className="min-h-[60px] flex-row items-center gap-3 rounded-panel bg-panel px-4 py-2 hover:bg-panel2"
      style={{ display: 'flex', flexDirection: 'row' }}
      testID="to-audit"
    >
      <Icon name="document" size={22} tone="dim" />
      <Body strong className="flex-1">
        Audit
      </Body>
      <Label>what people did</Label>
      <Icon name="forward" size={18} tone="dim" />
    </Link>
  );
}
