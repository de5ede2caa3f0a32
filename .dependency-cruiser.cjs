// Rings, outside in: routes → components → device | server → logbook → rivet. A ring knows only
// those inside it; the same logbook runs on the phone and on the server, so it may know neither.
const APP = '^src/(routes|hooks|service-worker)';

/** @type {import('dependency-cruiser').IConfiguration} */
module.exports = {
	forbidden: [
		{ name: 'no-circular', severity: 'error', from: {}, to: { circular: true } },
		{
			name: 'not-resolvable',
			comment: 'An import that cannot be followed is one no rule below can judge.',
			severity: 'error',
			from: {},
			to: {
				couldNotResolve: true,
				pathNot: '^(virtual:|\\$app/|\\$env/|\\$service-worker|\\./\\$types|.*/build/handler\\.js)'
			}
		},
		{
			name: 'rivet-knows-nothing',
			severity: 'error',
			from: { path: '^src/lib/rivet/', pathNot: '\\.test\\.ts$' },
			to: { path: '^(src/(?!lib/rivet/)|migrations/)' }
		},
		{
			name: 'logbook-knows-rivet-only',
			severity: 'error',
			from: { path: '^src/lib/logbook/', pathNot: '\\.test\\.ts$' },
			to: { path: '^(src/(?!lib/(logbook|rivet)/)|migrations/)' }
		},
		{
			name: 'example-knows-logbook-and-rivet',
			severity: 'error',
			from: { path: '^src/lib/example/', pathNot: '\\.test\\.ts$' },
			to: { path: '^(src/(?!lib/(example|logbook|rivet)/)|migrations/)' }
		},
		{
			name: 'pure-stays-pure',
			comment: 'No framework, no storage and no Node in what both sides run.',
			severity: 'error',
			from: { path: '^src/lib/(rivet|logbook|example)/', pathNot: '\\.test\\.ts$' },
			to: {
				path: '^(\\$app/|\\$env/|node:)|(^|node_modules/)(svelte|@sveltejs|idb|kysely|better-sqlite3|lucia|pino)(/|$)'
			}
		},
		{
			name: 'pure-stays-pure-core',
			severity: 'error',
			from: { path: '^src/lib/(rivet|logbook|example)/', pathNot: '\\.test\\.ts$' },
			to: { dependencyTypes: ['core'] }
		},
		{
			name: 'device-knows-no-server',
			severity: 'error',
			from: { path: '^src/lib/device/', pathNot: '\\.test\\.ts$' },
			to: { path: '^(src/lib/(server|components|example)/|src/routes/|src/bin/|migrations/)' }
		},
		{
			name: 'server-knows-no-device',
			severity: 'error',
			from: { path: '^src/lib/server/' },
			to: { path: '^(src/lib/(device|components)/|src/routes/|src/bin/)' }
		},
		{
			name: 'components-know-no-server',
			severity: 'error',
			from: { path: '^src/lib/components/' },
			to: { path: '^(src/lib/server/|src/routes/|src/bin/|migrations/)' }
		},
		{
			name: 'nothing-knows-routes',
			severity: 'error',
			from: { path: '^src/', pathNot: APP },
			to: { path: APP }
		},
		{
			name: 'idb-in-device-only',
			severity: 'error',
			from: { path: '^src/', pathNot: '^src/lib/device/' },
			to: { path: '(^|node_modules/)idb(/|$)' }
		},
		{
			name: 'sql-in-server-only',
			severity: 'error',
			from: { path: '^src/', pathNot: '^src/(lib/server|bin)/' },
			to: { path: '(^|node_modules/)(kysely|better-sqlite3)(/|$)' }
		},
		{
			name: 'lucia-in-auth-only',
			severity: 'error',
			from: { path: '^src/', pathNot: '^src/lib/server/auth/' },
			to: { path: '(^|node_modules/)lucia(/|$)' }
		},
		{
			name: 'migrations-are-frozen',
			comment: 'A migration that imports the app changes when the app does.',
			severity: 'error',
			from: { path: '^migrations/' },
			to: { path: '^src/' }
		}
	],
	options: {
		doNotFollow: { path: 'node_modules' },
		exclude: { path: '^(build|\\.svelte-kit)/' },
		tsConfig: { fileName: 'tsconfig.json' },
		tsPreCompilationDeps: true,
		enhancedResolveOptions: {
			exportsFields: ['exports'],
			conditionNames: ['svelte', 'import', 'node', 'default', 'types'],
			extensions: ['.ts', '.js', '.svelte', '.d.ts']
		}
	}
};
