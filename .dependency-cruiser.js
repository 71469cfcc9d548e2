// The layers on the resolved graph: what eslint.config.js says by the words of an import, this says by the file it reaches,
// through relative paths too; and it finds cycles.

const lib = '^src/lib';
const server = `${lib}/server`;
const browser = `${lib}/(components|state|workers)/`;
const jobThread = `${lib}/workers/job-[^/]*\\.ts$`;
const rules = [];

/**
 * @param {string} name
 * @param {string} comment
 * @param {object} from
 * @param {object} to
 */
const forbid = (name, comment, from, to) => rules.push({ name, comment, severity: 'error', from, to });

forbid('no-cycles', 'Modules do not import each other in a circle.', {}, { circular: true });
forbid(
	'resolves',
	'Every import leads to a file or an installed package.',
	{},
	{ couldNotResolve: true, pathNot: '^(\\$app|\\$env)/|\\$types$' }
);
forbid(
	'morph-is-pure',
	'The engine imports nothing but itself, ml-matrix and numeric (three-mesh-bvh with three for BVHs).',
	{ path: `${lib}/morph/` },
	{ pathNot: [`${lib}/morph/`, 'node_modules/(ml-matrix|numeric|three-mesh-bvh|three|@types/three)/', '^src/types/'] }
);
forbid(
	'morph-has-one-door',
	'From outside the engine only its index is imported (tests reach inside).',
	{ path: '^(src|bench)/', pathNot: `${lib}/morph/` },
	{ path: `${lib}/morph/`, pathNot: `${lib}/morph/index\\.ts$` }
);
forbid(
	'api-knows-no-layer',
	'The schemas import nothing of the application.',
	{ path: `${lib}/api/` },
	{ path: '^src/', pathNot: [`${lib}/api/`, `${lib}/format/`] }
);
forbid(
	'server-below-screens',
	'Server modules know no screen.',
	{ path: `${server}/` },
	{ path: ['^src/routes/', `${lib}/(components|state)/`] }
);
forbid(
	'browser-without-server',
	'What runs in the browser imports no server module.',
	{ path: browser, pathNot: jobThread },
	{ path: `${server}/` }
);
forbid(
	'workers-below-state',
	'Workers know neither state nor components.',
	{ path: `${lib}/workers/` },
	{ path: [`${lib}/(components|state)/`, '^src/routes/'] }
);
forbid(
	'state-below-components',
	'State knows no component.',
	{ path: `${lib}/state/` },
	{ path: [`${lib}/components/`, '^src/routes/'] }
);
forbid(
	'components-below-routes',
	'Components know no route.',
	{ path: `${lib}/components/` },
	{ path: '^src/routes/' }
);
forbid(
	'routes-through-services',
	'Routes ask services, not repositories or the database.',
	{ path: ['^src/routes/', '^src/hooks'] },
	{ path: [`${server}/repositories/`, `${server}/db/`] }
);
forbid(
	'engine-off-the-event-loop',
	'Route handlers use the types of the engine only: its work is done in worker threads.',
	{ path: ['^src/routes/.*\\+(server|page\\.server|layout\\.server)\\.ts$', '^src/hooks'] },
	{ path: `${lib}/morph/`, dependencyTypesNot: ['type-only'] }
);
forbid(
	'services-without-models',
	'Services know no models.',
	{ path: `${server}/services/` },
	{ path: `${server}/db/models` }
);
forbid(
	'repositories-below-services',
	'Repositories know no service.',
	{ path: `${server}/repositories/` },
	{ path: `${server}/(services|jobs|http|auth|mail)/`, dependencyTypesNot: ['type-only'] }
);
forbid(
	'database-at-the-bottom',
	'The database client and the models know nothing above them.',
	{ path: `${server}/db/` },
	{ path: `${server}/`, pathNot: `${server}/db/` }
);
forbid(
	'sql-in-its-place',
	'Only db and repositories speak SQL.',
	{ path: '^src/', pathNot: [`${server}/(db|repositories)/`] },
	{ path: 'node_modules/(sequelize|umzug|pg|pg-copy-streams)/' }
);
forbid(
	'server-packages-are-dependencies',
	'The worker and command bundles find their packages at run time: those belong in dependencies.',
	{ path: [`${server}/`, '^src/cli/', jobThread] },
	{ dependencyTypes: ['npm-dev'], dependencyTypesNot: ['type-only'], pathNot: 'node_modules/(@sveltejs/kit|@types)/' }
);

export default {
	forbidden: rules,
	options: {
		doNotFollow: { path: 'node_modules' },
		tsPreCompilationDeps: true,
		webpackConfig: { fileName: '.dependency-cruiser.alias.cjs' },
		enhancedResolveOptions: {
			exportsFields: ['exports'],
			conditionNames: ['import', 'node', 'default', 'types', 'svelte']
		}
	}
};
