import { useEffect, useRef, useState, type PointerEvent } from 'react';
import { View } from 'react-native';
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
 * For everything that makes masses move: the button is pressed, kept for 1.5 s and let go, or, by keyboard and for whoever
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

type Stage = 'idle' | 'pressed' | 'ripe';
/** How a press ended that sent nothing. */
type Failed = 'early' | 'beside';

/**
 * The press counts when the finger is lifted on the button after 1.5 s: sliding off takes it back (WCAG 2.2, 2.5.2), and nothing that
 * comes to lie under the finger meanwhile is tapped by letting go.
 */
function useKeptPress({ off, onConfirm }: { off: boolean; onConfirm: () => void }) {
  const [stage, setStage] = useState<Stage>('idle');
  const [failed, setFailed] = useState<Failed | null>(null);
  const timer = useRef<ReturnType<typeof setTimeout>>(undefined);
  useEffect(() => () => clearTimeout(timer.current), []);
  const end = () => {
    clearTimeout(timer.current);
    setStage('idle');
  };
  return {
    stage: off ? ('idle' as const) : stage,
    failed,
    handlers: {
      onPointerDown: (event: PointerEvent<HTMLDivElement>) => {
        if (off || event.button > 0) return;
        event.currentTarget.setPointerCapture?.(event.pointerId);
        setFailed(null);
        setStage('pressed');
        timer.current = setTimeout(() => setStage('ripe'), keepMs);
      },
      onPointerUp: (event: PointerEvent<HTMLDivElement>) => {
        if (off || stage === 'idle') return;
        const on = isOn(event);
        if (stage === 'ripe' && on) onConfirm();
        setFailed(!on ? 'beside' : stage === 'pressed' ? 'early' : null);
        end();
      },
      onPointerCancel: end,
      // A long touch opens a menu on some phones, which would end the press.
      onContextMenu: (event: { preventDefault: () => void }) => event.preventDefault(),
    },
  };
}

function isOn({ currentTarget, clientX, clientY }: PointerEvent<HTMLDivElement>): boolean {
  const { left, right, top, bottom } = currentTarget.getBoundingClientRect();
  return clientX >= left && clientX <= right && clientY >= top && clientY <= bottom;
}

const failedWords: Record<Failed, string> = {
  early: 'Let go too early: nothing was sent. Keep it pressed for 1.5 s.',
  beside: 'Let go beside the button: nothing was sent. Press it again.',
};
const keepWords: Record<Stage, string | null> = { idle: null, pressed: 'Keep pressed', ripe: 'Now let go' };

function KeepButton({
  label,
  icon,
  onConfirm,
  onKeyboard,
  disabled = false,
  busy = false,
  testID,
}: PressAndKeepProps & { onKeyboard: () => void }) {
  const off = disabled || busy;
  const { stage, failed, handlers } = useKeptPress({ off, onConfirm });
  const onKeyDown = (event: { key: string; preventDefault: () => void }) => {
    if (off || (event.key !== 'Enter' && event.key !== ' ')) return;
    event.preventDefault();
    onKeyboard();
  };
  return (
    <View className="gap-1">
      <div
        role="button"
        tabIndex={off ? -1 : 0}
        aria-label={`${label}: press and keep for 1.5 seconds, then let go`}
        aria-busy={busy || undefined}
        aria-disabled={off || undefined}
        data-testid={testID}
        {...handlers}
        onKeyDown={onKeyDown}
        className={`relative min-h-action touch-none select-none overflow-hidden rounded-action border-2 border-lamp bg-panel2 ${off ? 'opacity-50' : 'cursor-pointer'}`}
      >
        {stage === 'idle' ? null : (
          <View className="ef-fill absolute inset-0 bg-lamp opacity-30" style={{ animationDuration: `${keepMs}ms` } as object} />
        )}
        <View className="pointer-events-none min-h-action flex-row items-center justify-center gap-2 px-5">
          {icon === undefined ? null : <Icon name={icon} size={24} tone="lamp" />}
          <Body size={17} strong tone={stage === 'idle' ? 'lamp' : 'text'}>
            {busy ? 'Sending' : (keepWords[stage] ?? label)}
          </Body>
        </View>
      </div>
      <Label role="status" aria-live="polite" className="text-center">
        {failed === null ? 'Press and keep for 1.5 s, then let go.' : failedWords[failed]}
      </Label>
    </View>
  );
}
