import { useRef, useState } from 'react';
import { View } from 'react-native';
import { Body, Button, Icon, Label, useWide } from '@/components/ui';

interface FileDropProps {
  onFile: (file: File) => void;
  busy: boolean;
}

/** Chooses a file by a button; where there is room a file may be dropped as well. */
export function FileDrop({ onFile, busy }: FileDropProps) {
  const wide = useWide();
  const input = useRef<HTMLInputElement>(null);
  const [over, setOver] = useState(false);
  const take = (files: FileList | null) => {
    const file = files?.[0];
    if (file) onFile(file);
    if (input.current !== null) input.current.value = '';
  };
  return (
    <div
      onDragOver={(event) => {
        event.preventDefault();
        setOver(true);
      }}
      onDragLeave={() => setOver(false)}
      onDrop={(event) => {
        event.preventDefault();
        setOver(false);
        if (!busy) take(event.dataTransfer.files);
      }}
      className={`rounded-panel border-2 border-dashed p-5 ${over ? 'border-lamp bg-panel2' : 'border-line bg-panel'}`}
      data-testid="file-drop"
    >
      <input
        ref={input}
        type="file"
        accept=".csv,.txt,.tsv,.dat,text/csv,text/plain"
        hidden
        aria-hidden
        tabIndex={-1}
        onChange={(event) => take(event.target.files)}
        data-testid="file-input"
      />
      <View className="items-center gap-3">
        <Icon name="import" size={28} tone="dim" />
        <Body className="text-center">A text file with a column of times and a column of deflection.</Body>
        <Button kind="primary" label="Choose a file" busy={busy} onPress={() => input.current?.click()} testID="choose-file" />
        <Label className="text-center">
          {wide ? 'Or drop it here. ' : ''}Comma, semicolon, tab, bar or space; ISO 8601, epoch or elapsed seconds; rad, mrad, µrad, m or
          mm.
        </Label>
      </View>
    </div>
  );
}
