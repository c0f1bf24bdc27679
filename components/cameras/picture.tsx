import { useState } from 'react';
import { useTheme } from '@/components/theme';
import { Label } from '@/components/ui';

interface PictureProps {
  address: string;
  /** What is seen, and when it was. */
  words: string;
  testID?: string;
}

/** A camera's picture, as wide as its place; under the red lamp in shades of red alone. */
export function Picture({ address, words, testID }: PictureProps) {
  const { name, colors } = useTheme();
  const [failed, setFailed] = useState<string | null>(null);
  const red = name === 'red';
  if (failed === address) return <Label>The picture could not be loaded.</Label>;
  return (
    <div style={{ background: red ? colors.text : undefined, borderRadius: 8, overflow: 'hidden', maxWidth: 480 }}>
      <img
        src={address}
        alt={words}
        data-testid={testID}
        onError={() => setFailed(address)}
        style={{
          display: 'block',
          width: '100%',
          aspectRatio: '4 / 3',
          objectFit: 'contain',
          ...(red ? { filter: 'grayscale(1)', mixBlendMode: 'multiply' } : {}),
        }}
      />
    </div>
  );
}
