import { useCallback, useState } from 'react';
import type { LayoutChangeEvent } from 'react-native';

/** Width of a view in px as laid out; the fallback until it is known (and where nothing is laid out, as in tests). */
export function useWidth(fallback = 340): { width: number; onLayout: (event: LayoutChangeEvent) => void } {
  const [width, setWidth] = useState(fallback);
  const onLayout = useCallback((event: LayoutChangeEvent) => {
    const next = Math.round(event.nativeEvent.layout.width);
    if (next > 0) setWidth(next);
  }, []);
  return { width, onLayout };
}
