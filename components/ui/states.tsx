import type { ReactNode } from 'react';
import { ActivityIndicator, View } from 'react-native';
import { useTheme } from '@/components/theme';
import { Button } from './button';
import { Icon, type IconName } from './icon';
import { Panel } from './panel';
import { Body, Heading, Label } from './text';

interface EmptyProps {
  title: string;
  children?: ReactNode;
  icon?: IconName;
  action?: { label: string; onPress: () => void; icon?: IconName };
}

/** Nothing here yet: says what would be here and how to get it. */
export function Empty({ title, children, icon = 'document', action }: EmptyProps) {
  return (
    <View className="items-center gap-3 px-4 py-10">
      <View className="h-16 w-16 items-center justify-center rounded-full bg-panel">
        <Icon name={icon} size={28} tone="dim" />
      </View>
      <Heading level={2} className="text-center">
        {title}
      </Heading>
      {children === undefined ? null : (
        <Body tone="dim" className="max-w-[420px] text-center">
          {children}
        </Body>
      )}
      {action === undefined ? null : <Button kind="primary" label={action.label} icon={action.icon} onPress={action.onPress} />}
    </View>
  );
}

/** Work under way, in words; over a second it should also say how far it is. */
export function Loading({ label = 'Loading' }: { label?: string }) {
  const { colors } = useTheme();
  return (
    <View role="status" aria-live="polite" className="flex-row items-center justify-center gap-3 py-10">
      <ActivityIndicator color={colors.lamp} aria-hidden />
      <Body tone="dim">{label}</Body>
    </View>
  );
}

/** The server cannot be reached: what is shown may be old, and a run goes on without this page. */
export function Offline({ since }: { since?: string }) {
  return (
    <View role="status" aria-live="polite" className="flex-row items-center gap-3 border-b border-line bg-panel2 px-4 py-2">
      <Icon name="offline" tone="lamp" />
      <Body size={13} className="flex-1">
        No connection to the server{since === undefined ? '' : ` since ${since}`}. What you see may be old; trying again. A run goes on
        without this page: stop it at the rig if you must.
      </Body>
    </View>
  );
}

interface ProblemNoticeProps {
  /** Where it happened, for example `The draft was not saved`. */
  title: string;
  /** The problem's sentence: what is wrong and what would be right. */
  detail: string;
  errors?: readonly { path: string; message: string }[] | undefined;
  action?: { label: string; onPress: () => void };
}

/** An RFC 9457 problem in words, each wrong thing with its place. */
export function ProblemNotice({ title, detail, errors, action }: ProblemNoticeProps) {
  return (
    <Panel edge="danger" className="gap-2">
      <View role="alert" className="gap-2">
        <View className="flex-row items-center gap-2">
          <Icon name="warning" tone="danger" />
          <Body strong className="flex-1">
            {title}
          </Body>
        </View>
        <Body>{detail}</Body>
        {errors?.map((error) => (
          <Body key={`${error.path} ${error.message}`} size={13}>
            {error.path === '' ? '' : <Label className="font-mono">{error.path} </Label>}
            {error.message}
          </Body>
        ))}
      </View>
      {action === undefined ? null : <Button label={action.label} onPress={action.onPress} className="self-start" />}
    </Panel>
  );
}
