const { ModernFakeTimers } = require('@jest/fake-timers');
const { ModuleMocker } = require('jest-mock');

/**
 * Tests run in the very realm that the packages run in, as the product does: no second `Error` or `Date`, no interceptor before each global. What a
 * test leaves on the globals of Jest is put back.
 */
module.exports = class OneRealmEnvironment {
  constructor({ projectConfig }) {
    this.global = globalThis;
    this.exportConditions = () => ['node', 'node-addons'];
    this.kept = { console: globalThis.console, exit: process.exit };
    this.moduleMocker = new ModuleMocker(globalThis);
    this.fakeTimers = null;
    this.fakeTimersModern = new ModernFakeTimers({ config: projectConfig, global: globalThis });
  }

  async setup() {}

  async teardown() {
    this.fakeTimersModern.dispose();
    globalThis.console = this.kept.console;
    process.exit = this.kept.exit;
  }

  getVmContext() {
    return globalThis;
  }
};
