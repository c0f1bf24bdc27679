import type { ReactNode } from 'react';

/** Stands for the router where a screen is shown alone: remembers where it was led. */

export const went: string[] = [];
export const params: Record<string, string> = {};

export const useRouter = () => ({
  push: (href: string) => void went.push(href),
  replace: (href: string) => void went.push(href),
  back: () => void went.push('back'),
});
export const useLocalSearchParams = () => params;
export const usePathname = () => '/';
export const Redirect = ({ href }: { href: string }) => <p>to {href}</p>;
export const Link = ({ href, children, ...rest }: { href: string; children: ReactNode; 'aria-label'?: string }) => (
  <a href={href} aria-label={rest['aria-label']}>
    {children}
  </a>
);
