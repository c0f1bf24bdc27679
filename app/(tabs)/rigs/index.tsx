import { Empty, Screen } from '@/components/ui';

export default function Rigs() {
  return (
    <Screen title="Rigs">
      <Empty title="Nothing here yet" />
    </Screen>
  );
}
