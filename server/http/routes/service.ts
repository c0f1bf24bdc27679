import * as contracts from '@/shared/contracts/service';
import { routes } from '@/shared/contracts';
import { protocolJsonSchemaText } from '@/shared/protocol/json-schema';
import { ping } from '@/server/store/health';
import { isoOf } from '../maker';
import { once } from '../once';
import { openApiOf } from '../openapi';
import { mount } from '../route-context';
import { softwareVersion } from '../software';

/** Made when first asked for: to make them takes a tenth of a second, which a server that comes back to a run has not. */
const openApi = once(() => JSON.stringify(openApiOf(routes, softwareVersion)));
const protocolSchema = once(protocolJsonSchemaText);

export const serviceRoutes = [
  mount(contracts.getHealth, async ({ services }) => ({
    ok: await ping(services.database),
    version: softwareVersion,
    serverAt: isoOf(services.clock.utcMs()),
    demo: services.config.demo,
  })),

  mount(contracts.getOpenApi, ({ res }) => {
    res.set('Cache-Control', 'no-cache').type('application/json').send(openApi());
    return undefined;
  }),

  mount(contracts.getProtocolSchema, ({ res }) => {
    res.set('Cache-Control', 'no-cache').type('application/schema+json').send(protocolSchema());
    return undefined;
  }),
];
