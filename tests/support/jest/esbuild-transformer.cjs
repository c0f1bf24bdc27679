const { transformSync } = require('esbuild');

/** TypeScript to what Node runs, a tenth of the time that Babel takes. Nothing is type-checked here: `npm run check` does that. */
module.exports = {
  process(source, sourcefile) {
    const { code, map } = transformSync(source, {
      sourcefile,
      loader: sourcefile.endsWith('.tsx') ? 'tsx' : 'ts',
      format: 'cjs',
      target: 'node20',
      sourcemap: 'external',
    });
    return { code, map };
  },
};
