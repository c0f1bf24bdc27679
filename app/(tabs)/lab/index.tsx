import { Empty, Screen } from '@/components/ui';

export default function Lab() {
  return (
    <Screen title="Lab">
      <Empty title="Nothing here yet" />
    </Screen>
  );
}
