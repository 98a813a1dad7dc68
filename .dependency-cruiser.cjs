// Who may import whom, each rule with its reason. tests/gates/borders.test.ts asserts that modules were seen.
const notFrom = (name, comment, from, to, extra = {}) => ({
  name,
  comment,
  severity: 'error',
  from: { path: from, ...extra.from },
  to: { path: to, ...extra.to },
});

module.exports = {
  forbidden: [
    {
      name: 'no-circles',
      comment: 'A circle means that two files are one thing; types alone may point both ways.',
      severity: 'error',
      from: {},
      to: { circular: true, viaOnly: { dependencyTypesNot: ['type-only'] } },
    },
    notFrom(
      'drivers-know-hardware-only',
      'A driver is handed its link and its clock and knows nothing of antennas.',
      '^drivers/',
      '^(daemon|mocks|dashboard|tests)/',
    ),
    notFrom(
      'daemon-never-mocks',
      'The daemon meets a simulated bench over real sockets or handed-in links, never by import.',
      '^daemon/',
      '^(mocks|tests)/',
    ),
    notFrom(
      'dashboard-knows-messages-only',
      'The page sees what the gateway sends and nothing else of the daemon.',
      '^dashboard/',
      '^(drivers|mocks|tests|daemon)/',
      { to: { pathNot: '^daemon/gateway/messages\\.ts$' } },
    ),
    notFrom(
      'daemon-draws-only-in-report',
      'Plots are shared with the page through DOM-free option builders, and only reports draw.',
      '^daemon/',
      '^dashboard/',
      { from: { pathNot: '^daemon/report/' } },
    ),
    notFrom(
      'mocks-share-no-parser',
      'Both sides of a wire must not share a mistake: mocks take time and bytes, no line splitter, no driver.',
      '^mocks/',
      '^(drivers|daemon|dashboard|tests)/',
      { to: { pathNot: '^drivers/(clock|due-queue|link/(link|memory|tcp))\\.ts$' } },
    ),
    notFrom('pattern-is-pure', 'Pattern mathematics has no I/O and no state.', '^daemon/pattern/', '.*', {
      to: { pathNot: '^daemon/pattern/' },
    }),
    notFrom(
      'stages-do-not-look-ahead',
      'plan, run, archive and results do not know who shows or schedules them.',
      '^daemon/(files|plan|run|archive|results|pattern)/',
      '^daemon/(cli|gateway|report|schedule|notify)/',
    ),
    notFrom(
      'sql-only-in-archive',
      'Storage sits behind one interface.',
      '^(daemon/(?!archive/)|drivers/|mocks/)',
      'better-sqlite3',
    ),
    notFrom(
      'wires-only-in-bench',
      'One file names a wire; everything else is handed a Link.',
      '^daemon/(?!bench\\.ts)',
      '^drivers/link/(tcp|memory|serial)\\.ts$',
    ),
  ],
  options: {
    parser: 'swc',
    tsPreCompilationDeps: true,
    doNotFollow: { path: 'node_modules' },
    exclude: { path: '^dist/' },
    moduleSystems: ['es6'],
    enhancedResolveOptions: { extensions: ['.ts', '.js', '.json'] },
  },
};
