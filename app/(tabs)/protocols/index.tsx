import { Empty, Screen } from '@/components/ui';

export default function Protocols() {
  return (
    <Screen title="Protocols">
      <Empty title="Nothing here yet" />
    </Screen>
  );
}
