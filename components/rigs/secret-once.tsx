import { useState } from 'react';
import { View } from 'react-native';
import { Body, Button, Label } from '@/components/ui';

interface SecretOnceProps {
  secret: string;
  /** What whoever has it can do. */
  may: string;
  testID: string;
}

/** A token, the one time that it is seen. */
export function SecretOnce({ secret, may, testID }: SecretOnceProps) {
  const [copied, setCopied] = useState<'yes' | 'no' | null>(null);
  const copy = () =>
    void navigator.clipboard
      .writeText(secret)
      .then(() => setCopied('yes'))
      .catch(() => setCopied('no'));
  return (
    <>
      <Body strong>Shown this once: only a hash of it is kept here.</Body>
      <View className="rounded-action bg-panel2 p-3">
        <Body size={13} className="break-all font-mono" testID={testID}>
          {secret}
        </Body>
      </View>
      {'clipboard' in navigator ? (
        <Button icon="duplicate" label="Copy" className="self-start" onPress={copy} testID="copy-secret" />
      ) : null}
      <Label role="status">
        {copied === 'yes'
          ? 'Copied. Put it where only the device can read it.'
          : copied === 'no'
            ? 'The browser did not let it be copied: mark the text and copy it.'
            : `Put it where only the device can read it. Whoever has it can ${may}, and do nothing else.`}
      </Label>
    </>
  );
}
