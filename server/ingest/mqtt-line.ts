import { connect } from 'mqtt';
import type { OpenBrokerLine } from '../interfaces/broker-line';

const CONNECT_MS = 10_000;
/** Half as long again without a word and the connection counts as dead (MQTT 3.1.1, 3.1.2.10), s. */
const KEEPALIVE_S = 20;

/** Version 3.1.1, a clean session, QoS 1 where the sender offers it. */
export const openMqttLine: OpenBrokerLine = ({ address, clientId, userName, password, filters }, listener) => {
  let reason = 'the broker closed the connection';
  let ended = false;
  const client = connect(address, {
    ...{ protocolVersion: 4, clientId, clean: true, reconnectPeriod: 0, connectTimeout: CONNECT_MS, keepalive: KEEPALIVE_S },
    ...(userName === null ? {} : { username: userName }),
    ...(password === null ? {} : { password }),
  });
  const end = (why: string | null) => {
    if (ended) return;
    ended = true;
    client.end(true);
    if (why !== null) listener.away(why);
  };
  client.on('connect', () => {
    client.subscribe([...filters], { qos: 1 }, (error, granted) => {
      const refused = (granted ?? []).filter(({ qos }) => (qos as number) > 2).map(({ topic }) => topic);
      if (error !== null || refused.length > 0) end(`the broker does not let us read ${refused.join(', ') || filters.join(', ')}`);
      else if (!ended) listener.connected();
    });
  });
  client.on('message', (topic, payload, { retain }) => {
    if (!ended) listener.message({ topic, payload, retained: retain });
  });
  client.on('error', (error) => {
    reason = wordsOf(error);
  });
  client.on('close', () => end(reason));
  return { close: () => end(null) };
};

function wordsOf(error: Error): string {
  const { code } = error as { code?: string | number };
  if (code === 'ECONNREFUSED') return 'nothing listens at this address';
  if (code === 'ENOTFOUND' || code === 'EAI_AGAIN') return 'there is no host of this name';
  if (code === 4 || code === 5) return 'the broker refused the name or the password';
  return error.message === '' ? `the connection failed (${String(code)})` : error.message;
}
