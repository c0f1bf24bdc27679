import { useEffect, useRef, useState } from 'react';
import { Pressable, View } from 'react-native';
import { Button } from './button';
import { Icon, type IconName } from './icon';
import { Switch } from './switch';
import { Body, Label } from './text';

const keepMs = 1500;

interface PressAndKeepProps {
  label: string;
  icon?: IconName;
  /** What the switch states, for example `I have read the review; the rig may move`. */
  statement: string;
  onConfirm: () => void;
  disabled?: boolean;
  busy?: boolean;
  testID?: string;
}

/**
 * For everything that makes masses move: the button is pressed and kept for 1.5 s, or, by keyboard and for whoever
 * cannot keep a press, a switch is set and then a button pressed. One press alone never moves anything.
 */
export function PressAndKeep(props: PressAndKeepProps) {
  const [bySwitch, setBySwitch] = useState(false);
  return (
    <View className="gap-1">
      {bySwitch ? <SwitchAndButton {...props} /> : <KeepButton {...props} onKeyboard={() => setBySwitch(true)} />}
      <Button
        kind="quiet"
        label={bySwitch ? 'Press and keep instead' : 'Use a switch and a button instead'}
        onPress={() => setBySwitch(!bySwitch)}
        testID={props.testID === undefined ? undefined : `${props.testID}-other-way`}
      />
    </View>
  );
}

function SwitchAndButton({ label, icon, statement, onConfirm, disabled = false, busy = false, testID }: PressAndKeepProps) {
  const [ready, setReady] = useState(false);
  return (
    <View className="gap-2">
      <Switch
        label={statement}
        value={ready}
        onChange={setReady}
        disabled={disabled}
        testID={testID === undefined ? undefined : `${testID}-switch`}
      />
      <Button
        kind="primary"
        size="action"
        icon={icon}
        label={label}
        disabled={disabled || !ready}
        busy={busy}
        testID={testID}
        onPress={() => {
          setReady(false);
          onConfirm();
        }}
      />
    </View>
  );
}

function KeepButton({
  label,
  icon,
  onConfirm,
  onKeyboard,
  disabled = false,
  busy = false,
  testID,
}: PressAndKeepProps & { onKeyboard: () => void }) {
  const [keeping, setKeeping] = useState(false);
  const [early, setEarly] = useState(false);
  const timer = useRef<ReturnType<typeof setTimeout>>(undefined);
  useEffect(() => () => clearTimeout(timer.current), []);
  const begin = () => {
    setEarly(false);
    setKeeping(true);
    timer.current = setTimeout(() => {
      setKeeping(false);
      onConfirm();
    }, keepMs);
  };
  const end = () => {
    clearTimeout(timer.current);
    if (keeping) setEarly(true);
    setKeeping(false);
  };
  const off = disabled || busy;
  const keys = {
    onKeyDown: (event: { key: string; preventDefault: () => void }) =>
      event.key === 'Enter' || event.key === ' ' ? (event.preventDefault(), onKeyboard()) : undefined,
  };
  return (
    <View className="gap-1">
      <Pressable
        role="button"
        aria-label={`${label}: press and keep for 1.5 seconds`}
        aria-busy={busy || undefined}
        disabled={off}
        onPressIn={begin}
        onPressOut={end}
        testID={testID}
        {...keys}
        className={`min-h-action select-none overflow-hidden rounded-action border-2 border-lamp bg-panel2 ${off ? 'opacity-50' : ''}`}
        style={{ touchAction: 'none' } as object}
      >
        {keeping ? (
          <View className="ef-fill absolute inset-0 bg-lamp opacity-30" style={{ animationDuration: `${keepMs}ms` } as object} />
        ) : null}
        <View className="min-h-action flex-row items-center justify-center gap-2 px-5">
          {icon === undefined ? null : <Icon name={icon} size={24} tone="lamp" />}
          <Body size={17} strong tone={keeping ? 'text' : 'lamp'}>
            {busy ? 'Sending' : keeping ? 'Keep pressed' : label}
          </Body>
        </View>
      </Pressable>
      <Label role="status" aria-live="polite" className="text-center">
        {early ? 'Let go too early: nothing was sent. Keep it pressed for 1.5 s.' : 'Press and keep for 1.5 s.'}
      </Label>
    </View>
  );
}
