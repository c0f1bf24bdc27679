const { default: Runtime } = require('jest-runtime');

const compiled = new Map();

/** Each test file has a page and modules of its own, but what is compiled is the same for all of them. */
module.exports = class CompiledOnceRuntime extends Runtime {
  createScriptFromCode(code, filename) {
    const known = compiled.get(filename);
    if (known?.code === code) return known.script;
    const script = super.createScriptFromCode(code, filename);
    compiled.set(filename, { code, script });
    return script;
  }
};
module.exports.default = module.exports;
