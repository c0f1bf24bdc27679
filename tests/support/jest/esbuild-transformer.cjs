const { transformSync } = require('esbuild');

/** What runs as TypeScript in Node, with the markup and the one variable that the web build has. */
const loaders = { '.ts': 'ts', '.tsx': 'tsx', '.js': 'jsx', '.jsx': 'jsx' };

/** To what Node runs, a tenth of the time that Babel takes. Nothing is type-checked here: `npm run check` does that. */
module.exports = {
  process(source, sourcefile) {
    const { code, map } = transformSync(source, {
      sourcefile,
      loader: loaders[/\.\w+$/.exec(sourcefile)?.[0] ?? ''] ?? 'ts',
      format: 'cjs',
      target: 'node20',
      sourcemap: 'external',
      // Packages are loaded by Node itself, which has no `import()` in a realm of a test.
      supported: { 'dynamic-import': false },
      jsx: 'automatic',
      jsxImportSource: 'nativewind',
      define: { 'process.env.EXPO_OS': '"web"' },
    });
    return { code, map };
  },
};
