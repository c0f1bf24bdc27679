/** Three projects: pure code and server in Node, components in a DOM, the product in a real browser. */
const alias = { '^@/(.*)$': '<rootDir>/$1' };
const [expoUntransformed, ...otherUntransformed] = require('jest-expo/web/jest-preset').transformIgnorePatterns;
const webUntransformed = [expoUntransformed.replace('(?!(', '(?!(temporal-polyfill|temporal-utils|'), ...otherUntransformed];
const node = {
  testEnvironment: '<rootDir>/tests/support/jest/one-realm-environment.cjs',
  runtime: '<rootDir>/tests/support/jest/one-realm-runtime.cjs',
  transform: { '\\.tsx?$': '<rootDir>/tests/support/jest/esbuild-transformer.cjs' },
  moduleNameMapper: alias,
  modulePathIgnorePatterns: ['<rootDir>/dist', '<rootDir>/.state'],
};

module.exports = {
  projects: [
    { ...node, displayName: 'node', testMatch: ['<rootDir>/tests/**/*.test.ts'], testPathIgnorePatterns: ['<rootDir>/tests/e2e/'] },
    {
      displayName: 'web',
      preset: 'jest-expo/web',
      runtime: '<rootDir>/tests/support/jest/compiled-once-runtime.cjs',
      transform: { '\\.[jt]sx?$': '<rootDir>/tests/support/jest/esbuild-transformer.cjs' },
      transformIgnorePatterns: webUntransformed,
      testMatch: ['<rootDir>/tests/components/**/*.test.tsx'],
      moduleNameMapper: {
        ...alias,
        '\\.css$': '<rootDir>/tests/support/empty-module.js',
        '^react-native$': 'react-native-web',
        '^expo-router$': '<rootDir>/tests/components/support/fake-router',
      },
      modulePathIgnorePatterns: ['<rootDir>/dist', '<rootDir>/.state'],
    },
    { ...node, displayName: 'e2e', testMatch: ['<rootDir>/tests/e2e/**/*.test.ts'] },
    { ...node, displayName: 'e2e-row', testMatch: ['<rootDir>/tests/e2e/row.ts'] },
  ],
};
