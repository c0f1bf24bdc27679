import { Link, usePathname, type Href } from 'expo-router';
import { View } from 'react-native';
import { Body, Icon, type IconName } from '@/components/ui';

const places: readonly { href: Href; label: string; icon: IconName }[] = [
  { href: '/rigs', label: 'Rigs', icon: 'rig' },
  { href: '/protocols', label: 'Protocols', icon: 'protocols' },
  { href: '/runs', label: 'Runs', icon: 'runs' },
  { href: '/calendar', label: 'Calendar', icon: 'calendar' },
  { href: '/lab', label: 'Lab', icon: 'lab' },
];

/** The places of the application: along the bottom on a phone, at the side when wide. */
export function NavigationBar() {
  const pathname = usePathname();
  return (
    <View
      role="navigation"
      aria-label="Places"
      className="flex-none flex-row border-t border-line bg-ink pb-[env(safe-area-inset-bottom)] wide:w-[104px] wide:flex-col wide:gap-1 wide:border-r wide:border-t-0 wide:px-2 wide:py-4"
    >
      <View className="hidden items-center pb-4 wide:flex" aria-hidden>
        <Body size={20} tone="lamp" className="font-mono">
          ef
        </Body>
      </View>
      {places.map((place) => (
        <Place key={place.label} {...place} here={pathname === place.href || pathname.startsWith(`${String(place.href)}/`)} />
      ))}
    </View>
  );
}

function Place({ href, label, icon, here }: { href: Href; label: string; icon: IconName; here: boolean }) {
  return (
    <Link
      href={href}
      aria-current={here ? 'page' : undefined}
      className={`min-h-[58px] flex-1 items-center justify-center gap-1 rounded-xl py-2 hover:bg-panel wide:min-h-[60px] wide:flex-none ${here ? 'wide:bg-panel' : ''}`}
      style={{ display: 'flex', flexDirection: 'column' }}
    >
      <Icon name={icon} size={22} tone={here ? 'lamp' : 'dim'} />
      <Body size={13} tone={here ? 'lamp' : 'dim'} strong={here}>
        {label}
      </Body>
    </Link>
  );
}
