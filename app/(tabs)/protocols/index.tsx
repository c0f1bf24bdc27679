import { ProtocolsScreen } from '@/components/protocols/protocols-screen';

export default function Protocols() {
  return <ProtocolsScreen />;
}
