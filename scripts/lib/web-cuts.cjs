const { join, relative, sep } = require('node:path');

/**
 * What the web application never reaches in the packages it uses, found by summing the built files by package. Metro keeps every module that is
 * imported anywhere, so these would ride along with the first page.
 */

const router = 'expo-router/build';
const web = 'react-native-web/dist/exports';
const svg = 'react-native-svg/lib/module';

/** Read as an empty module. */
const empty = new Set([
  // zod: translations (English is imported directly), JSON Schema in both directions, compiled schemas.
  ...['locales/index', 'core/compile', 'core/to-json-schema', 'core/json-schema-processors', 'core/json-schema-generator'].map(
    (name) => `zod/v4/${name}.js`,
  ),
  ...['from-json-schema', 'deep-partial', 'in-out'].map((name) => `zod/v4/classic/${name}.js`),
  // expo-router: tab bars, native stacks with their headers and menus, link previews. The application's layouts are plain slots.
  ...[
    'layouts/Tabs',
    'layouts/experimental-stack/index',
    'layouts/stack-utils/index',
    'standard-navigation/index',
    'native-tabs/NativeTabTrigger',
  ].map((name) => `${router}/${name}.js`),
  ...['link/LinkWithPreview', 'link/elements', 'views/ErrorBoundary', 'views/Sitemap', 'views/Unmatched'].map(
    (name) => `${router}/${name}.js`,
  ),
  // The navigation library inside it: what expo-router has written anew, and what builds navigators without files.
  ...['core/StaticNavigation', 'core/getPathFromState', 'core/getStateFromPath', 'routers/DrawerRouter', 'routers/TabRouter'].map(
    (name) => `${router}/react-navigation/${name}.js`,
  ),
  ...[
    'Link',
    'NavigationContainer',
    'ServerContainer',
    'createStaticNavigation',
    'useLinkBuilder',
    'useLinkProps',
    'useLinkTo',
    'useScrollToTop',
  ].map((name) => `${router}/react-navigation/native/${name}.js`),
  // react-native-web: lists that draw only what is seen, animations, and controls that the application draws itself.
  ...[
    'Animated',
    'Button',
    'CheckBox',
    'FlatList',
    'Image',
    'ImageBackground',
    'InteractionManager',
    'KeyboardAvoidingView',
    'LayoutAnimation',
    'Modal',
  ].map((name) => `${web}/${name}/index.js`),
  ...['PanResponder', 'Picker', 'ProgressBar', 'SectionList', 'Share', 'Switch', 'TextInput', 'VirtualizedList'].map(
    (name) => `${web}/${name}/index.js`,
  ),
  ...['', 'Highlight', 'NativeFeedback', 'Opacity', 'WithoutFeedback'].map((name) => `${web}/Touchable${name}/index.js`),
  // react-native-svg: drawings from text, pressable shapes, transforms as text.
  ...['xml', 'lib/SvgTouchableMixin', 'lib/extract/transform', 'lib/extract/transformToRn'].map((name) => `${svg}/${name}.js`),
]);

/** Read as an empty module where nothing of development is left: what warns of mistakes in styles. */
const emptyWhenBuilt = new Set([`${web}/StyleSheet/validate.js`]);

/** Read as another module. */
const instead = {
  // The heights of tab bars and the flags of screens are asked for without anything around them.
  [`${router}/react-navigation/bottom-tabs/index.js`]: `${router}/react-navigation/bottom-tabs/utils/BottomTabBarHeightContext.js`,
  'react-native-screens/lib/module/index.js': 'react-native-screens/lib/module/flags.js',
  // The title of a page is set by the page itself.
  [`${router}/head/ExpoHead.js`]: `${router}/head/ExpoHead.android.js`,
};

/** Wraps a resolver of Metro so that the web build leaves out what is listed above. */
module.exports.cutting = (root, resolve) => {
  const modules = join(root, 'node_modules');
  const stacks = `${router}/fork/native-stack/createNativeStackNavigator.js`;
  return (context, moduleName, platform) => {
    const found = resolve(context, moduleName, platform);
    if (platform !== 'web' || found.type !== 'sourceFile' || !found.filePath.startsWith(modules)) return found;
    const path = relative(modules, found.filePath).split(sep).join('/');
    if (path === stacks) return { type: 'sourceFile', filePath: join(root, 'scripts', 'lib', 'no-native-stack.cjs') };
    if (instead[path] !== undefined) return { type: 'sourceFile', filePath: join(modules, instead[path]) };
    if (!empty.has(path) && (context.dev || !emptyWhenBuilt.has(path))) return found;
    if (!context.originModulePath.startsWith(modules))
      throw new Error(`${moduleName} is cut from the web build: take ${path} off the list in scripts/lib/web-cuts.cjs`);
    return { type: 'empty' };
  };
};
