import { NewProtocolScreen } from '@/components/protocols/new-protocol-screen';

export default function NewProtocol() {
  return <NewProtocolScreen />;
}
