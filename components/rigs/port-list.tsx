import { Pressable, View } from 'react-native';
import { useLabQuery, wordsOf } from '@/components/api';
import { Body, Button, Icon, Label, ProblemNotice } from '@/components/ui';
import { listSerialPorts, type SerialPortView } from '@/shared/contracts/link';

interface PortListProps {
  /** The path as it is typed below. */
  chosen: string;
  onChoose: (port: SerialPortView) => void;
}

/** The serial ports that the server sees, to choose one with a tap; read again when asked. */
export function PortList({ chosen, onChoose }: PortListProps) {
  const query = useLabQuery(listSerialPorts);
  const ports = query.data?.data.items ?? [];
  return (
    <View className="gap-2" testID="port-list">
      <View className="flex-row items-center justify-between gap-3">
        <Label tone="text" className="shrink">
          {query.isPending
            ? 'Looking for ports …'
            : ports.length === 0
              ? 'The server sees no serial port. Plug the board in and look again, or type a path.'
              : 'Ports of the server'}
        </Label>
        <Button kind="quiet" label="Look again" busy={query.isFetching} onPress={() => void query.refetch()} testID="look-again" />
      </View>
      {query.isError ? <ProblemNotice title="The ports could not be listed" {...wordsOf(query.error)} /> : null}
      <View role="radiogroup" aria-label="Serial ports" className="gap-2">
        {ports.map((port) => (
          <Port key={port.path} port={port} chosen={chosen === port.path || chosen === port.stablePath} onPress={() => onChoose(port)} />
        ))}
      </View>
    </View>
  );
}

function Port({ port, chosen, onPress }: { port: SerialPortView; chosen: boolean; onPress: () => void }) {
  const details = [
    port.label,
    port.usb === null ? null : `USB ${port.usb.serialNumber}`,
    port.usedBy === null ? 'free' : `used by ${port.usedBy}`,
  ];
  return (
    <Pressable
      role="radio"
      aria-checked={chosen}
      aria-label={`${port.path}, ${details.filter((part) => part !== null).join(', ')}`}
      onPress={onPress}
      testID={`port-${port.path}`}
      className={`min-h-target flex-row items-center gap-3 rounded-action border px-3 py-2 ${chosen ? 'border-lamp bg-panel2' : 'border-line'}`}
    >
      <Icon name={chosen ? 'passed' : 'link'} size={18} tone={chosen ? 'lamp' : 'dim'} />
      <View className="min-w-0 flex-1">
        <Body className="font-mono">{port.path}</Body>
        <Label>{details.filter((part) => part !== null).join(' · ')}</Label>
      </View>
    </Pressable>
  );
}
