const http = require('node:http');
const { getDefaultConfig } = require('expo/metro-config');
const { withNativeWind } = require('nativewind/metro');
const { cutting } = require('./scripts/lib/web-cuts.cjs');

const config = getDefaultConfig(__dirname);

const { resolveRequest } = config.resolver;
config.resolver.resolveRequest = cutting(__dirname, (context, moduleName, platform) =>
  (resolveRequest ?? context.resolveRequest)(context, moduleName, platform),
);

config.transformer.minifierPath = require.resolve('./scripts/lib/minifier.cjs');

// In development the page comes from here and the API from the server: one origin, so cookies and live streams work as in production.
config.server.enhanceMiddleware = (middleware) => (request, response, next) => {
  const port = process.env.EVENFALL_API_PORT;
  if (port === undefined || !request.url.startsWith('/api/')) return middleware(request, response, next);
  const upstream = http.request(
    { host: '127.0.0.1', port, path: request.url, method: request.method, headers: request.headers },
    (reply) => {
      response.writeHead(reply.statusCode ?? 502, reply.headers);
      reply.pipe(response);
    },
  );
  upstream.on('error', () => {
    if (!response.headersSent) response.writeHead(502, { 'content-type': 'text/plain' });
    response.end('The API does not answer.');
  });
  response.on('close', () => upstream.destroy());
  request.pipe(upstream);
  return undefined;
};

module.exports = withNativeWind(config, { input: './global.css', disableTypeScriptGeneration: true });
