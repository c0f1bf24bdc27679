import { connect } from 'mqtt';
import type { OpenBrokerLine } from '../interfaces/broker-line';

const CONNECT_MS = 10_000;
/** Half as long again without a word and the connection counts as dead (MQTT 3.1.1, 3.1.2.10), s. */
const KEEPALIVE_S = 20;

/** Version 3.1.1, a clean session, QoS 1 where the sender offers it. */
export const openMqttLine: OpenBrokerLine = ({ address, clientId, userName, password, ca, filters }, listener) => {
  let reason = 'the broker closed the connection';
  let ended = false;
  const client = connect(address, {
    ...{ protocolVersion: 4, clientId, clean: true, reconnectPeriod: 0, connectTimeout: CONNECT_MS, keepalive: KEEPALIVE_S },
    ...(userName === null ? {} : { username: userName }),
    ...(password === null ? {} : { password }),
    ...(ca === null ? {} : { ca }),
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

const unproved = 'nobody whom this server trusts vouches for its certificate: give that of the authority which signed it';
const ofCertificates: Record<string, string> = {
  UNABLE_TO_VERIFY_LEAF_SIGNATURE: unproved,
  UNABLE_TO_GET_ISSUER_CERT_LOCALLY: unproved,
  SELF_SIGNED_CERT_IN_CHAIN: unproved,
  DEPTH_ZERO_SELF_SIGNED_CERT: unproved,
  CERT_SIGNATURE_FAILURE: unproved,
  CERT_HAS_EXPIRED: 'its certificate has expired',
  CERT_NOT_YET_VALID: 'its certificate is not valid yet; is a clock wrong?',
  ERR_TLS_CERT_ALTNAME_INVALID: 'its certificate is for another host than this address names',
};

function wordsOf(error: Error): string {
  const { code } = error as { code?: string | number };
  if (code === 'ECONNREFUSED') return 'nothing listens at this address';
  if (code === 'ENOTFOUND' || code === 'EAI_AGAIN') return 'there is no host of this name';
  if (typeof code === 'string' && Object.hasOwn(ofCertificates, code)) return ofCertificates[code] as string;
  if (code === 4 || code === 5) return 'the broker refused the name or the password';
  return error.message === '' ? `the connection failed (${String(code)})` : error.message;
}
