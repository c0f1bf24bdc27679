import { View } from 'react-native';
import { Body } from '@/components/ui';

interface TryItProps {
  /** Of the API, with what it takes. */
  path: string;
  contentType: string;
  /** As curl is given it. */
  data: string;
}

/** A line that sends something with the token that is seen this once. */
export function TryIt({ path, contentType, data }: TryItProps) {
  const lines = [
    `curl -sS ${window.location.origin}${path}`,
    '-H "Authorization: Bearer $TOKEN"',
    `-H "Content-Type: ${contentType}"`,
    `--data-binary ${data}`,
  ];
  return (
    <>
      <Body strong>Try it</Body>
      <View className="rounded-action bg-panel2 p-3">
        <Body size={13} className="break-all font-mono">
          {lines.join(' \\\n  ')}
        </Body>
      </View>
    </>
  );
}
