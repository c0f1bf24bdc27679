import { Field, Label, Tabs } from '@/components/ui';
import type { LinkSettings } from '@/shared/contracts/rigs';

export type NetworkLink = Extract<LinkSettings, { kind: 'tcp' }>;

interface NetworkFieldsProps {
  link: NetworkLink;
  onChange: (link: NetworkLink) => void;
  /** The port as it was typed. */
  port: string;
  onPort: (text: string) => void;
  /** What would be right, by field. */
  wrong: Record<string, string>;
}

/** A network serial server: where it is, and whether it is told the speed of its port. */
export function NetworkFields({ link, onChange, port, onPort, wrong }: NetworkFieldsProps) {
  return (
    <>
      <Field
        label="Address"
        value={link.host}
        onChange={(host) => onChange({ ...link, host: host.trim() })}
        mono
        placeholder="10.0.0.4"
        hint="Name or address of the serial server, as this server reaches it. Nothing but the controller's protocol is spoken there."
        error={link.host === '' ? undefined : wrong['host']}
        testID="link-host"
      />
      <Field label="Port" value={port} onChange={onPort} type="number" error={port === '' ? undefined : wrong['port']} testID="link-port" />
      <Tabs
        label="How bytes travel"
        value={link.mode}
        options={[
          { value: 'raw', label: 'Raw' },
          { value: 'rfc2217', label: 'RFC 2217' },
        ]}
        onChange={(mode) => onChange({ ...link, mode })}
      />
      <Label>
        {link.mode === 'raw'
          ? `Bytes as they are. Set the serial server's port to ${link.baudRate} baud, 8 data bits, no parity, 1 stop bit.`
          : `Telnet with the COM port option: the serial server's port is set to ${link.baudRate} baud from here.`}
      </Label>
    </>
  );
}
