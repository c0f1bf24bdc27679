import { AuditScreen } from '@/components/shell/lazy-screens';

export default function Audit() {
  return <AuditScreen />;
}
