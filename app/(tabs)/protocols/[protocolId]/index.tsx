import { EditorScreen } from '@/components/protocols/editor-screen';

export default function ProtocolEditor() {
  return <EditorScreen />;
}
