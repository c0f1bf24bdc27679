import { readDecimal } from '@/components/ui/read-decimal';
import type { BrokerTopic, BrokerView } from '@/shared/contracts/brokers';

/** A broker as it is being written down. Pure. */

export type TimeForm = 'arrival' | NonNullable<BrokerTopic['time']>['form'];

export interface TopicDraft {
  filter: string;
  channel: string;
  role: 'deflection' | 'environment';
  unit: string;
  rate: string;
  valuePath: string;
  form: TimeForm;
  timePath: string;
  timeU: string;
}

export interface BrokerDraft {
  address: string;
  ca: string;
  /** Name and password stay those that were given before. */
  signsInAsBefore: boolean;
  userName: string;
  password: string;
  topics: TopicDraft[];
}

export const freshTopic: TopicDraft = {
  ...{ filter: '', channel: 'box temperature', role: 'environment', unit: 'degC', rate: '0.1' },
  ...{ valuePath: '', form: 'arrival', timePath: '', timeU: '1' },
};

export const freshBroker: BrokerDraft = {
  ...{ address: 'mqtt://', ca: '', signsInAsBefore: false, userName: '', password: '' },
  topics: [freshTopic],
};

export const draftOf = ({ address, ca, signsIn, topics }: BrokerView): BrokerDraft => ({
  ...{ address, ca: ca ?? '', signsInAsBefore: signsIn, userName: '', password: '' },
  topics: topics.map(({ filter, channel, valuePath, time, timeUS }) => ({
    ...{ filter, channel: channel.name, role: channel.role, unit: channel.unit, rate: String(channel.rateHz) },
    ...{ valuePath: valuePath ?? '', form: time?.form ?? 'arrival', timePath: time?.path ?? '', timeU: String(timeUS) },
  })),
});

const positive = (text: string) => (readDecimal(text) ?? 0) > 0;

export const isWhole = ({ topics }: BrokerDraft): boolean =>
  topics.every(
    ({ filter, channel, unit, form, timePath, rate, timeU }) =>
      [filter, channel, unit, ...(form === 'arrival' ? [] : [timePath])].every((text) => text.trim() !== '') &&
      [rate, timeU].every(positive),
  );

const orNull = (text: string) => (text.trim() === '' ? null : text.trim());

const topicOf = ({ filter, channel, role, unit, rate, valuePath, form, timePath, timeU }: TopicDraft): BrokerTopic => ({
  filter: filter.trim(),
  channel: { name: channel.trim(), role, unit: unit.trim(), rateHz: readDecimal(rate) ?? 0 },
  valuePath: orNull(valuePath),
  time: form === 'arrival' ? null : { path: timePath.trim(), form },
  timeUS: readDecimal(timeU) ?? 0,
});

export const settingOf = ({ address, ca, topics }: BrokerDraft) => ({
  ...{ address: address.trim(), ca: orNull(ca), topics: topics.map(topicOf) },
});

export const signInOf = ({ userName, password }: BrokerDraft) => ({
  ...{ userName: orNull(userName), password: password === '' ? null : password },
});
