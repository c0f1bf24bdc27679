import { useState } from 'react';
import { View } from 'react-native';
import { Field, Label, Tabs } from '@/components/ui';
import type { SerialPortView } from '@/shared/contracts/link';
import type { LinkSettings } from '@/shared/contracts/rigs';
import { PortList } from './port-list';
import { wrongFields } from './link-words';
import { NetworkFields, type NetworkLink } from './network-fields';

type SerialLink = Extract<LinkSettings, { kind: 'serial' }>;

interface LinkFormProps {
  link: LinkSettings;
  onChange: (link: LinkSettings) => void;
  errors: Record<string, string>;
}

const usualBaud = 115_200;

const insideServer = {
  board:
    'The firmware of the controller on a board that the server emulates, with a turntable and a pendulum that answer to it. It behaves as a real board does: its position is unknown after a reset, and it is homed by a person at the rig.',
  simulated:
    'A light stand-in for a controller inside the server, with the same line protocol and limits, and a pendulum that answers to it. For learning, rehearsing and tests.',
};

/** What was typed as a whole number; no number at all where it is none, so that nothing else is used in its place. */
const numberOf = (text: string) => (/^\s*\d+\s*$/.test(text) ? Number(text) : NaN);

/** A controller inside the server, a serial line by its path and speed, or a network serial server. What was typed for the line survives a look at the other choice. */
export function LinkForm({ link, onChange, errors }: LinkFormProps) {
  const [line, setLine] = useState<SerialLink>(link.kind === 'serial' ? link : { kind: 'serial', path: '', baudRate: usualBaud });
  const [path, setPath] = useState(line.path);
  const [baud, setBaud] = useState(String(line.baudRate));
  const [network, setNetwork] = useState<NetworkLink>(
    link.kind === 'tcp' ? link : { kind: 'tcp', host: '', port: NaN, mode: 'raw', baudRate: usualBaud },
  );
  const [port, setPort] = useState(link.kind === 'tcp' ? String(link.port) : '');
  const wrong = { ...wrongFields(link), ...errors };
  /** What has no field here, the levels of the control lines, stays as it was. */
  const serial = (next: SerialLink) => {
    setLine(next);
    onChange(next);
  };
  const typeBaud = (text: string) => {
    setBaud(text);
    serial({ ...line, baudRate: numberOf(text) });
  };
  /** Another path is another device: the one that was known under the old path is no longer looked for. */
  const typePath = (text: string, usb?: SerialLink['usb']) => {
    setPath(text);
    serial({ ...line, path: text.trim(), usb });
  };
  const choosePort = (found: SerialPortView) => typePath(found.stablePath ?? found.path, found.usb ?? undefined);
  const overNetwork = (next: NetworkLink) => {
    setNetwork(next);
    onChange(next);
  };
  const typePort = (text: string) => {
    setPort(text);
    overNetwork({ ...network, port: numberOf(text) });
  };
  const choose = (kind: LinkSettings['kind']) => {
    if (kind === 'serial') return serial(line);
    return kind === 'tcp' ? overNetwork(network) : onChange({ kind });
  };
  return (
    <View className="gap-4">
      <Tabs
        label="Kind of link"
        value={link.kind}
        options={[
          { value: 'board', label: 'Emulated board' },
          { value: 'simulated', label: 'Simulated' },
          { value: 'serial', label: 'Serial line' },
          { value: 'tcp', label: 'Network' },
        ]}
        onChange={choose}
      />
      {(link.kind === 'board' || link.kind === 'simulated') && <Label>{insideServer[link.kind]}</Label>}
      {link.kind === 'tcp' && <NetworkFields link={network} onChange={overNetwork} port={port} onPort={typePort} wrong={wrong} />}
      {link.kind === 'serial' && (
        <>
          <PortList chosen={path} onChoose={choosePort} />
          <Field
            label="Path of the line"
            value={path}
            onChange={(text) => typePath(text)}
            mono
            placeholder="/dev/serial/by-id/…"
            hint="As the server sees it. A name under /dev/serial/by-id stays the same whatever is plugged in; one like /dev/ttyUSB0 does not."
            error={path.trim() === '' ? undefined : wrong['path']}
            testID="link-path"
          />
          <Field label="Speed" value={baud} onChange={typeBaud} type="number" unit="baud" error={wrong['baudRate']} testID="link-baud" />
        </>
      )}
    </View>
  );
}
