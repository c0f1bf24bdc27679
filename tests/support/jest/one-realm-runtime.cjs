const { default: Runtime } = require('jest-runtime');

/** The tests' own code, compiled once for all files that use it. */
const compiled = new Map();

/**
 * Packages are loaded once for all test files, by Node itself; the code of the project is loaded anew for each file, so that no file sees what another
 * one left in a module. Nothing of a package is ever replaced in these tests.
 */
module.exports = class OneRealmRuntime extends Runtime {
  createScriptFromCode(code, filename) {
    const known = compiled.get(filename);
    if (known?.code === code) return known.script;
    const script = super.createScriptFromCode(code, filename);
    const here = { runInContext: (_context, options) => script.runInThisContext(options) };
    compiled.set(filename, { code, script: here });
    return here;
  }

  _loadModule(localModule, from, moduleName, modulePath, options, registry) {
    if (options?.isInternalModule !== true && modulePath.includes('/node_modules/') && /\.[cm]?js$/.test(modulePath)) {
      localModule.exports = require(modulePath);
      localModule.loaded = true;
    } else super._loadModule(localModule, from, moduleName, modulePath, options, registry);
  }
};
module.exports.default = module.exports;
