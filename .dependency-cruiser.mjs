// Who may import whom. The folders tell the story of a recording; the arrows may only run one way.
const PASSAGE = 'enrolment|credentials|upload|ingest|filing';
const below = 'custody|acoustics|storage|contract|platform|keys|policy';

/** @type {import('dependency-cruiser').IConfiguration} */
export default {
  forbidden: [
    {
      name: 'no-circular',
      severity: 'error',
      from: {},
      to: { circular: true, dependencyTypesNot: ['type-only'] },
    },
    {
      name: 'app-never-db',
      severity: 'error',
      from: { path: '^app/' },
      to: { path: '^(db|devices|storage-fake|tests)/' },
    },
    {
      name: 'components-browser-safe',
      comment: 'components: ui, contract and pure code that runs in a browser',
      severity: 'error',
      from: { path: '^components/' },
      to: {
        path: '^(app|db|devices|storage-fake|tests)/|^lib/(?!contract/|custody/pure/|acoustics/(pictures/|types|sentences|limits|decode/(wav|wavFormat|riff|blocks|samples|sniff|types)\\.ts)|identity/permissions)',
      },
    },
    {
      name: 'ui-knows-no-domain',
      severity: 'error',
      from: { path: '^components/ui/' },
      to: { path: '^(lib|components/(?!ui/))' },
    },
    {
      name: 'passage-folders-apart',
      comment: 'a passage folder never imports another one: what two need moves down',
      severity: 'error',
      from: { path: `^lib/(${PASSAGE})/` },
      to: { path: `^lib/(?!(${below})/)`, pathNot: '^lib/$1/' },
    },
    {
      name: 'keepers-look-down',
      severity: 'error',
      from: { path: '^lib/(custody|fleet|readings|records|identity)/' },
      to: { path: '^lib/(?!(platform|storage|mail|contract|custody|acoustics)/)', pathNot: '^lib/$1/' },
    },
    {
      name: 'db-knows-platform',
      severity: 'error',
      from: { path: '^db/(?!seed/)' },
      to: { path: '^(app|components|devices|storage-fake|tests)/|^lib/(?!platform/)' },
    },
    {
      name: 'pure-stays-pure',
      severity: 'error',
      from: { path: '^lib/(acoustics|contract|custody/pure)/' },
      to: {
        path: '^(app|components|db|devices|storage-fake|tests|lib)/',
        pathNot: '^lib/(acoustics|contract|custody/pure)/',
      },
    },
    {
      name: 'devices-know-contract',
      comment: 'a device maker could have written it',
      severity: 'error',
      from: { path: '^devices/' },
      to: { path: '^(app|components|db|storage-fake|tests)/|^lib/(?!contract/)' },
    },
    {
      name: 'storage-fake-alone',
      severity: 'error',
      from: { path: '^storage-fake/' },
      to: { path: '^(app|components|db|devices|lib|tests)/' },
    },
    {
      name: 'next-at-the-edge',
      severity: 'error',
      from: { path: '^(lib/(?!http/)|db|devices|storage-fake)' },
      to: { path: '^node_modules/next/' },
    },
    {
      name: 'no-tests-in-product',
      severity: 'error',
      from: { path: '^(app|components|db|lib|devices|storage-fake)/' },
      to: { path: '^tests/' },
    },
  ],
  options: {
    doNotFollow: { path: 'node_modules' },
    exclude: { path: '^(\\.next|\\.data)/' },
    tsPreCompilationDeps: true,
    tsConfig: { fileName: 'tsconfig.json' },
    enhancedResolveOptions: {
      exportsFields: ['exports'],
      conditionNames: ['import', 'require', 'node', 'default', 'types'],
    },
  },
};
