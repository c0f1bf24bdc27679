import { Link, type Href } from 'expo-router';
import { Body, Icon, Label, type IconName } from '@/components/ui';

interface LabLinkProps {
  href: string;
  icon: IconName;
  tone?: 'dim' | 'lamp';
  title: string;
  /** What is to be found there, in a few words. */
  words: string;
  testID: string;
}

/** The way to a page of the lab. */
export function LabLink({ href, icon, tone = 'dim', title, words, testID }: LabLinkProps) {
  return (
    <Link
      href={href as Href}
      className="min-h-[60px] flex-row items-center gap-3 rounded-panel bg-panel px-4 py-2 hover:bg-panel2"
      style={{ display: 'flex', flexDirection: 'row' }}
      testID={testID}
    >
      <Icon name={icon} size={22} tone={tone} />
      <Body strong className="flex-1">
        {title}
      </Body>
      <Label>{words}</Label>
      <Icon name="forward" size={18} tone="dim" />
    </Link>
  );
}
