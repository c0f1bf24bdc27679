import { ProtocolsScreen } from '@/components/shell/lazy-screens';

export default function Protocols() {
  return <ProtocolsScreen />;
}
