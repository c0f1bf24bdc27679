import { View } from 'react-native';
import { Empty } from '@/components/ui';

/** In place of a page that met an error, for example because a file of it did not arrive or belongs to an earlier version. */
export function PageFailed() {
  return (
    <View role="alert" className="h-full flex-1 justify-center bg-ink">
      <Empty
        title="This page could not be shown"
        icon="warning"
        action={{ label: 'Reload the page', onPress: () => window.location.reload() }}
      >
        A part of it did not arrive, or it met an error. A run goes on without this page: stop it at the rig if you must.
      </Empty>
    </View>
  );
}
