import { useEffect } from 'react';

/** Names the page in the browser's tab and for a screen reader. */
export function usePageTitle(title: string): void {
  useEffect(() => {
    document.title = `${title} · Evenfall`;
  }, [title]);
}
