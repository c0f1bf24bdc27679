import type { ReactNode } from 'react';
import { ScrollView, View } from 'react-native';
import Svg, { Circle, Line } from 'react-native-svg';
import { Body, Heading } from '@/components/ui';
import { usePageTitle } from '@/components/ui/use-page-title';

interface PublicPageProps {
  title: string;
  intro?: string;
  children?: ReactNode;
}

/** The frame of the pages that need no session: the mark, one heading, one column. */
export function PublicPage({ title, intro, children }: PublicPageProps) {
  usePageTitle(title);
  return (
    <ScrollView
      role="main"
      className="flex-1 bg-ink"
      contentContainerClassName="items-center px-4 pb-10 pt-[12vh]"
      keyboardShouldPersistTaps="handled"
    >
      <View className="w-full max-w-[400px] gap-6">
        <View className="gap-5">
          <Mark />
          <View className="gap-2">
            <Heading level={1} size={30}>
              {title}
            </Heading>
            {intro === undefined ? null : (
              <Body tone="dim" size={15}>
                {intro}
              </Body>
            )}
          </View>
        </View>
        {children}
      </View>
    </ScrollView>
  );
}

/** A colour of the theme by its variable, so that the page drawn at build time has the theme of the device. */
const tone = (name: string) => `rgb(var(--${name}))`;

/** The turntable from above, sources at near: the mark of Evenfall. */
function Mark() {
  return (
    <View className="flex-row items-center gap-4">
      <Svg width={64} height={64} viewBox="0 0 64 64" aria-hidden>
        <Circle cx={32} cy={32} r={30} fill="none" stroke={tone('line')} strokeWidth={2.5} />
        <Line x1={12} y1={32} x2={52} y2={32} stroke={tone('dim')} strokeWidth={2} />
        <Circle cx={32} cy={32} r={2} fill={tone('lamp')} />
        <Circle cx={52} cy={32} r={4} fill={tone('text')} />
        <Circle cx={12} cy={32} r={4} fill={tone('text')} />
        <Circle cx={55} cy={20} r={7} fill={tone('near')} />
        <Circle cx={9} cy={44} r={7} fill={tone('near')} />
      </Svg>
      <Body size={20} strong tone="lamp">
        Evenfall
      </Body>
    </View>
  );
}
