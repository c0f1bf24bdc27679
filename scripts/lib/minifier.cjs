const { transformSync } = require('esbuild');

/**
 * Makes a module of the web build small, in a third of the default minifier's time. In parentheses a module's function is compiled whole
 * while the file is still arriving, instead of being skimmed then and compiled when the page starts.
 */
module.exports = ({ code }) => {
  const small = transformSync(code, { minify: true, target: 'es2022', legalComments: 'none' }).code.trimEnd();
  return { code: small.replace(/^__d\((function.*\})\);$/s, '__d(($1));') };
};
