import { useEffect, useRef, type ReactNode } from 'react';
import { Link, type Href } from 'expo-router';
import { ScrollView, View } from 'react-native';
import { Icon } from './icon';
import { Heading } from './text';
import { usePageTitle } from './use-page-title';
import { useLow, useWide } from './use-wide';

interface ScreenProps {
  title: string;
  /** Where the arrow before the title leads, and its name. */
  back?: { href: Href; label: string };
  /** At the right of the title: a chip, an icon button. */
  trailing?: ReactNode;
  children?: ReactNode;
  /** Stays at the bottom within the thumb's reach: the acts of the screen. */
  footer?: ReactNode;
  /** On a very low page the acts follow the content instead of covering it. Never for stop and hold. */
  footerGivesWay?: boolean;
  /** The right pane from 1024 px; below that it follows the content, unless `asideOnlyWide`. */
  aside?: ReactNode;
  asideOnlyWide?: boolean;
  testID?: string;
}

const gutter = 'w-full max-w-[960px] px-4 wide:px-7';

/** The frame of every screen: one heading of level 1, scrolled content, acts at the bottom, a right pane when wide. */
export function Screen({
  title,
  back,
  trailing,
  children,
  footer,
  footerGivesWay = false,
  aside,
  asideOnlyWide = false,
  testID,
}: ScreenProps) {
  const wide = useWide();
  const main = useRef<View>(null);
  usePageTitle(title);
  useEffect(() => focusAfterNavigation(main.current as unknown as HTMLElement | null), []);
  const beside = wide && aside !== undefined;
  const inFlow = useLow() && footerGivesWay;
  return (
    <View className="min-h-0 flex-1 flex-row" testID={testID}>
      <View ref={main} role="main" tabIndex={-1} className="ef-no-ring min-w-0 flex-1">
        <ScrollView className="flex-1" contentContainerClassName="pb-8" keyboardShouldPersistTaps="handled">
          <View className={`${gutter} gap-4 pt-2 wide:pt-4`}>
            <TitleBar title={title} back={back} trailing={trailing} />
            {children}
            {beside || asideOnlyWide ? null : aside}
            {inFlow ? footer : null}
          </View>
        </ScrollView>
        {footer === undefined || inFlow ? null : (
          <View className="border-t border-line bg-ink">
            <View className={`${gutter} py-2`}>{footer}</View>
          </View>
        )}
      </View>
      {beside ? (
        <ScrollView
          role="complementary"
          aria-label="Details"
          // It may scroll and hold nothing that a keyboard can reach.
          tabIndex={0}
          className="w-[400px] flex-none border-l border-line"
          contentContainerClassName="gap-4 p-5 pb-8"
        >
          {aside}
        </ScrollView>
      ) : null}
    </View>
  );
}

/** The link that led here is gone, and the focus with it: it goes to the new screen, so that the keyboard and a screen reader go on from there. */
function focusAfterNavigation(main: HTMLElement | null): void {
  if (document.activeElement === document.body) main?.focus({ preventScroll: true });
}

function TitleBar({ title, back, trailing }: Pick<ScreenProps, 'title' | 'back' | 'trailing'>) {
  return (
    <View className="min-h-target flex-row items-center gap-1">
      {back === undefined ? null : (
        <Link
          href={back.href}
          aria-label={`Back to ${back.label}`}
          className="-ml-3 h-12 w-12 flex-none items-center justify-center rounded-action hover:bg-panel2"
          style={{ display: 'flex' }}
        >
          <Icon name="back" />
        </Link>
      )}
      <Heading level={1} className="min-w-0 shrink grow py-1 wide:text-24" numberOfLines={2}>
        {title}
      </Heading>
      {trailing === undefined ? null : <View className="flex-none flex-row items-center gap-1">{trailing}</View>}
    </View>
  );
}
