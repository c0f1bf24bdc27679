/**
 * A plugin for Babel. Tests run in a context of their own, in which each look at a global goes through a slow interceptor: code that computes
 * spends most of its time there. What no test ever replaces becomes a variable of the module that uses it.
 */
const names = new Set([
  ...['Array', 'BigInt', 'Boolean', 'Error', 'Infinity', 'JSON', 'Map', 'Math', 'NaN', 'Number', 'Object', 'Set', 'String'],
  ...['Float64Array', 'Int32Array', 'Uint8Array', 'Uint16Array', 'Uint32Array'],
]);

module.exports = ({ types: t }) => ({
  visitor: {
    Program: {
      enter(program, { filename = '' }) {
        // The factories of mocks in tests may name nothing of their module.
        if (/\.test\.tsx?$/.test(filename)) return;
        const own = new Map();
        program.traverse({
          ReferencedIdentifier(path) {
            const { name } = path.node;
            if (!names.has(name) || path.scope.hasBinding(name, true)) return;
            if (!own.has(name)) own.set(name, program.scope.generateUidIdentifier(name));
            if (path.parentPath.isObjectProperty({ shorthand: true })) path.parent.shorthand = false;
            path.node.name = own.get(name).name;
          },
        });
        const declared = [...own].map(([name, id]) =>
          t.variableDeclarator(id, t.memberExpression(t.identifier('globalThis'), t.identifier(name))),
        );
        if (declared.length > 0) program.unshiftContainer('body', t.variableDeclaration('var', declared));
      },
    },
  },
});
