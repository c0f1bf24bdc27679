import { usePathname } from 'expo-router';
import { useEffect, useState } from 'react';
import { View } from 'react-native';
import { Body, Button } from '@/components/ui';
import { keepProgram, mayOffer } from './versions';

const everyMs = 3_600_000;

function nowAndThen(look: () => void): void {
  setInterval(look, everyMs);
  document.addEventListener('visibilitychange', () => (document.visibilityState === 'visible' ? look() : undefined));
}

let asked = false;

/** Once for each page, when it has all that it needs itself; a browser that keeps nothing goes on as before. */
function startKeeping(tell: (go: () => void) => void): void {
  if (asked || process.env.NODE_ENV !== 'production' || !('serviceWorker' in navigator)) return;
  asked = true;
  const browser = { serviceWorker: navigator.serviceWorker, reload: () => window.location.reload(), nowAndThen };
  void keepProgram(browser, tell).catch(() => undefined);
}

/** Says quietly that a newer version of the program is ready, where going over to it breaks nothing off. */
export function NewVersion() {
  const [go, setGo] = useState<(() => void) | null>(null);
  const pathname = usePathname();
  useEffect(() => startKeeping((ready) => setGo(() => ready)), []);
  if (go === null || !mayOffer(pathname)) return null;
  return (
    <View role="status" className="flex-row items-center gap-3 border-b border-line bg-panel2 px-4 py-1 wide:px-7" testID="new-version">
      <Body size={13} className="flex-1">
        A newer version of this page is ready. A run goes on meanwhile.
      </Body>
      <Button kind="quiet" label="Use it" onPress={go} testID="use-new-version" />
    </View>
  );
}
