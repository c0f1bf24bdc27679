import type { ReactNode } from 'react';
import { ActivityIndicator, Pressable, Text } from 'react-native';
import { useTheme } from '@/components/theme';
import type { ThemeColors } from '@/components/theme';
import { Icon, type IconName } from './icon';

/** `primary`: the one act of a screen, lamp amber. `danger`: outlined vermilion, for stop. `plain`: everything else. `quiet`: text only. */
export type ButtonKind = 'primary' | 'plain' | 'danger' | 'quiet';

const grounds: Record<ButtonKind, string> = {
  primary: 'bg-lamp hover:opacity-90',
  plain: 'bg-panel2 border border-line hover:border-faint',
  danger: 'border-2 border-danger bg-ink hover:bg-panel',
  quiet: 'hover:bg-panel2',
};
const words: Record<ButtonKind, { text: string; icon: keyof ThemeColors }> = {
  primary: { text: 'text-on-lamp', icon: 'onLamp' },
  plain: { text: 'text-text', icon: 'text' },
  danger: { text: 'text-danger', icon: 'danger' },
  quiet: { text: 'text-lamp', icon: 'lamp' },
};

export interface ButtonProps {
  label: string;
  onPress: () => void;
  kind?: ButtonKind;
  /** `target` 48 px; `action` 64 px for stop, hold and start. */
  size?: 'target' | 'action';
  icon?: IconName;
  disabled?: boolean;
  /** Shows that the act is under way and refuses a second press. */
  busy?: boolean;
  /** Said instead of the label where the label alone would be unclear out of its place. */
  accessibilityLabel?: string;
  testID?: string;
  className?: string;
  expanded?: boolean;
}

/** A button with words. At least 48 px high, 64 px as `action`. */
export function Button({
  label,
  onPress,
  kind = 'plain',
  size = 'target',
  icon,
  disabled = false,
  busy = false,
  accessibilityLabel,
  testID,
  className = '',
  expanded,
}: ButtonProps) {
  const { colors } = useTheme();
  const off = disabled || busy;
  const height = size === 'action' ? 'min-h-action px-5' : 'min-h-target px-4';
  return (
    <Pressable
      role="button"
      aria-label={accessibilityLabel ?? label}
      aria-busy={busy || undefined}
      aria-expanded={expanded}
      disabled={off}
      onPress={onPress}
      testID={testID}
      className={`flex-row items-center justify-center gap-2 rounded-action active:opacity-80 ${height} ${grounds[kind]} ${off ? 'opacity-50' : ''} ${className}`}
    >
      {busy ? (
        <ActivityIndicator size="small" color={colors[words[kind].icon]} aria-hidden />
      ) : icon === undefined ? null : (
        <Icon name={icon} size={size === 'action' ? 24 : 20} tone={words[kind].icon} />
      )}
      <Text className={`font-sans text-center ${size === 'action' ? 'text-17' : 'text-15'} font-strong ${words[kind].text}`}>{label}</Text>
    </Pressable>
  );
}

export interface IconButtonProps {
  icon: IconName;
  /** Always said, and shown as the tip of a mouse. */
  label: string;
  onPress: () => void;
  disabled?: boolean;
  pressed?: boolean;
  tone?: keyof ThemeColors;
  /** One of a row that shares the width: narrower than 48 px only where the page is narrower than seven of them. */
  shared?: boolean;
  testID?: string;
  className?: string;
  children?: ReactNode;
}

/** A square button with an icon only: 48 × 48 px, its name for screen readers and as a tip. */
export function IconButton({
  icon,
  label,
  onPress,
  disabled = false,
  pressed,
  tone = 'text',
  shared = false,
  testID,
  className = '',
  children,
}: IconButtonProps) {
  return (
    <Pressable
      role="button"
      aria-label={label}
      aria-pressed={pressed}
      {...{ title: label }}
      disabled={disabled}
      onPress={onPress}
      testID={testID}
      className={`min-h-target ${shared ? 'min-w-0 flex-1 wide:min-w-target' : 'min-w-target'} items-center justify-center rounded-action hover:bg-panel2 active:opacity-80 ${disabled ? 'opacity-40' : ''} ${pressed === true ? 'bg-panel2' : ''} ${className}`}
    >
      {children ?? <Icon name={icon} tone={tone} />}
    </Pressable>
  );
}
