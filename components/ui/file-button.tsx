import { useRef } from 'react';
import { View } from 'react-native';
import { Button, type ButtonProps } from './button';

interface FileButtonProps extends Omit<ButtonProps, 'onPress'> {
  /** For example `.json,application/json`. */
  accept: string;
  onText: (text: string, fileName: string) => void;
}

/** Opens the device's file choice and gives the chosen file's text. */
export function FileButton({ accept, onText, ...button }: FileButtonProps) {
  const input = useRef<HTMLInputElement>(null);
  const read = async (file: File | undefined) => {
    if (file !== undefined) onText(await file.text(), file.name);
    if (input.current !== null) input.current.value = '';
  };
  return (
    <View>
      <input
        ref={input}
        type="file"
        accept={accept}
        hidden
        aria-hidden
        tabIndex={-1}
        data-testid={button.testID === undefined ? undefined : `${button.testID}-input`}
        onChange={(event) => void read(event.target.files?.[0])}
      />
      <Button {...button} onPress={() => input.current?.click()} />
    </View>
  );
}
