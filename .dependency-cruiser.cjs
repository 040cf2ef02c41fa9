// The layout of DEVELOPERS.md: arrows only downward. A folder may import itself and the folders below it.
const order = [
  'math',
  'craft',
  'physics',
  'sensing',
  'control',
  'disturbance',
  'flight',
  'shaping',
  'measuring',
  'matching',
  'trials',
  'carrying',
  'cli',
  'app',
];
// Folders of one level do not see each other unless the order above puts one below the other AND it is
// not listed here: cli and app are two faces of the same core.
const apart = [
  ['cli', 'app'],
  ['measuring', 'shaping'],
];
const upward = order.slice(0, -1).map((name, level) => ({
  name: `${name}-imports-only-downward`,
  severity: 'error',
  from: { path: `^src/${name}/` },
  to: { path: `^src/(${order.slice(level + 1).join('|')})/` },
}));
const separate = apart.flatMap(([a, b]) => [
  {
    name: `${a}-apart-from-${b}`,
    severity: 'error',
    from: { path: `^src/${a}/` },
    to: { path: `^src/${b}/` },
  },
  {
    name: `${b}-apart-from-${a}`,
    severity: 'error',
    from: { path: `^src/${b}/` },
    to: { path: `^src/${a}/` },
  },
]);
module.exports = {
  forbidden: [
    ...upward,
    ...separate,
    { name: 'no-circles', severity: 'error', from: {}, to: { circular: true } },
    {
      name: 'node-only-in-cli',
      comment: 'Everything but the command line also runs in the browser.',
      severity: 'error',
      from: { path: '^src/', pathNot: '^src/(cli|.*\\.node\\.ts$)' },
      to: { dependencyTypes: ['core'] },
    },
    {
      name: 'view-libraries-only-in-app',
      severity: 'error',
      from: { path: '^src/', pathNot: '^src/app/' },
      to: { path: 'node_modules/(three|lil-gui|preact|uplot|idb)/' },
    },
    {
      name: 'source-never-imports-tests',
      severity: 'error',
      from: { path: '^src/' },
      to: { path: '^test/' },
    },
  ],
  options: {
    doNotFollow: { path: 'node_modules' },
    tsPreCompilationDeps: true,
    tsConfig: { fileName: 'tsconfig.json' },
    enhancedResolveOptions: { extensions: ['.ts', '.tsx', '.js', '.json'] },
  },
};
