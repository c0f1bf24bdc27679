import { NewProtocolScreen } from '@/components/shell/lazy-screens';

export default function NewProtocol() {
  return <NewProtocolScreen />;
}
