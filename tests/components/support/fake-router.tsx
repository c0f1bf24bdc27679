import type { ReactNode } from 'react';

/** Stands for the router in all tests of components: a screen is shown alone, and it is remembered where it was led. */

export const went: string[] = [];
export const params: Record<string, string> = {};

export const router = {
  push: (href: string) => void went.push(href),
  replace: (href: string) => void went.push(href),
  back: () => void went.push('back'),
};
export const useRouter = () => router;
export const useLocalSearchParams = () => params;
export const usePathname = () => '/';
export const Redirect = ({ href }: { href: string }) => <p>to {href}</p>;
export const Link = ({
  href,
  children,
  testID,
  ...rest
}: {
  href: string;
  children: ReactNode;
  testID?: string;
  'aria-label'?: string;
}) => (
  <a href={href} aria-label={rest['aria-label']} data-testid={testID}>
    {children}
  </a>
);
