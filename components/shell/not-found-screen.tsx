import { PublicPage } from '@/components/people/public-page';
import { TextLink } from '@/components/people/sign-in-screen';

/** An address that leads nowhere. */
export function NotFoundScreen() {
  return (
    <PublicPage title="Nothing here" intro="There is no page at this address. The link may be old, or cut off at its end.">
      <TextLink href="/rigs" label="To the rigs" />
    </PublicPage>
  );
}
