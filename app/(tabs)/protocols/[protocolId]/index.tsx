import { EditorScreen } from '@/components/shell/lazy-screens';

export default function ProtocolEditor() {
  return <EditorScreen />;
}
