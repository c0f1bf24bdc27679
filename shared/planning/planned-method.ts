import type { ProtocolDocument } from '../protocol/document';

/** Whether the u that is worked out of the dwells before a night is that of the method its protocol registered: near minus far by equilibria alone. */
export const uIsPlanned = ({ evaluation }: ProtocolDocument): boolean => (evaluation?.method ?? 'equilibrium') === 'equilibrium';
