import js from '@eslint/js';
import svelte from 'eslint-plugin-svelte';
import globals from 'globals';
import ts from 'typescript-eslint';
import svelteConfig from './svelte.config.js';

/**
 * The import direction of DEVELOPERS.md, folder by folder:
 * routes -> services -> (repositories, morph); routes -> components -> state -> workers -> morph.
 * dependency-cruiser checks the same on the resolved graph; here the editor says it while one types.
 */
const not = {
	routes: { regex: '(^|/)routes/', message: 'Nothing below the routes knows them.' },
	components: { regex: '^\\$lib/components(/|$)|(^|/)components/', message: 'This layer lies below the components.' },
	state: { regex: '^\\$lib/state(/|$)|(^|/)state/', message: 'This layer lies below the state.' },
	workers: { regex: '^\\$lib/workers(/|$)|(^|/)workers/', message: 'This layer does not use workers.' },
	server: { regex: '^\\$lib/server(/|$)|(^|/)server/', message: 'This runs in the browser: no server modules.' },
	services: { regex: '^\\$lib/server/services(/|$)|(^|/)services/', message: 'This layer lies below the services.' },
	repositories: {
		regex: '^\\$lib/server/repositories(/|$)|(^|/)repositories/',
		message: 'Queries are asked for through a service.'
	},
	models: { regex: '^\\$lib/server/db/models(/|$)|(^|/)db/models', message: 'Only repositories know the models.' },
	database: { regex: '^\\$lib/server/db(/|$)|(^|/)db/', message: 'The database is reached through services.' },
	sequelize: { regex: '^(sequelize|umzug|pg|pg-copy-streams)(/|$)', message: 'Only db and repositories speak SQL.' },
	morphInside: { regex: '^\\$lib/morph/.|(^|/)morph/.', message: 'The engine has one door: $lib/morph.' },
	morph: {
		regex: '^\\$lib/morph(/|$)|(^|/)morph(/|$)',
		message: 'Handlers call services; the engine never runs on the event loop.',
		allowTypeImports: true
	},
	svelte: { regex: '^(svelte|@sveltejs/kit|\\$app)(/|$)', message: 'This layer knows neither Svelte nor SvelteKit.' },
	node: { regex: '^node:', message: 'This runs in the browser too: nothing of Node.' }
};

/** The engine's whole world: itself and these. */
const morphOnly = {
	regex:
		'^(?!\\.|ml-matrix$|numeric$|three-mesh-bvh$|three$)|\\.\\./\\.\\./|^\\.\\./(?!\\.)(lib|server|api|workers|state|components)',
	message: 'The engine imports nothing but itself, ml-matrix and numeric (and three-mesh-bvh with three for BVHs).'
};

/**
 * @param {string[]} files
 * @param {object[]} patterns
 * @param {string[]} [ignores]
 */
const layer = (files, patterns, ignores = []) => ({
	files,
	ignores,
	rules: { '@typescript-eslint/no-restricted-imports': ['error', { patterns }] }
});

export default ts.config(
	{ ignores: ['node_modules/', '.svelte-kit/', 'build/', 'data/', 'test-results/', 'static/'] },
	js.configs.recommended,
	...ts.configs.recommended,
	...svelte.configs.recommended,
	...svelte.configs.prettier,
	{
		languageOptions: { globals: { ...globals.browser, ...globals.node } },
		linterOptions: { reportUnusedDisableDirectives: 'error' },
		rules: {
			// TypeScript itself knows what is defined.
			'no-undef': 'off',
			eqeqeq: ['error', 'always', { null: 'ignore' }],
			'no-console': 'error',
			'object-shorthand': 'error',
			'prefer-const': 'error',
			'@typescript-eslint/no-unused-vars': ['error', { argsIgnorePattern: '^_', varsIgnorePattern: '^_' }],
			'@typescript-eslint/consistent-type-imports': [
				'error',
				{ fixStyle: 'inline-type-imports', disallowTypeAnnotations: false }
			]
		}
	},
	{
		// The rules that need types. Not in .svelte files: each costs its own type-check there, more than all the rest together;
		// what is asynchronous belongs into the state's classes anyhow.
		files: ['src/**/*.ts', 'tests/**/*.ts'],
		languageOptions: {
			parserOptions: { projectService: true, tsconfigRootDir: import.meta.dirname, extraFileExtensions: ['.svelte'] }
		},
		rules: {
			'@typescript-eslint/no-floating-promises': 'error',
			'@typescript-eslint/no-misused-promises': ['error', { checksVoidReturn: { attributes: false } }],
			'@typescript-eslint/await-thenable': 'error',
			'@typescript-eslint/only-throw-error': 'off'
		}
	},
	{
		files: ['**/*.svelte', '**/*.svelte.ts', '**/*.svelte.js'],
		languageOptions: { parserOptions: { parser: ts.parser, svelteConfig } },
		rules: {
			// In Svelte 5 a rune's `let` is what makes it writable.
			'prefer-const': 'off',
			// Paths are served from the root; there is no base path to resolve.
			'svelte/no-navigation-without-resolve': 'off',
			// Maps and sets are kept raw and replaced, or never leave their function.
			'svelte/prefer-svelte-reactivity': 'off'
		}
	},
	{ files: ['**/*.cjs'], rules: { '@typescript-eslint/no-require-imports': 'off' } },
	{
		// Commands talk on the terminal.
		files: ['scripts/**', 'src/cli/**', 'bench/**'],
		rules: { 'no-console': 'off' }
	},

	layer(['src/lib/morph/**/*.ts'], [morphOnly]),
	layer(
		['src/lib/api/**/*.ts', 'src/lib/format/**/*.ts'],
		[not.server, not.components, not.state, not.workers, not.routes, not.node, not.sequelize]
	),
	layer(
		['src/lib/workers/**/*.ts'],
		[not.server, not.components, not.state, not.routes, not.svelte, not.morphInside, not.sequelize, not.node],
		// Threads of the server: shells around the services' work.
		['src/lib/workers/job-*.ts']
	),
	layer(
		['src/lib/workers/job-*.ts'],
		[not.components, not.state, not.routes, not.svelte, not.morphInside, not.sequelize]
	),
	layer(['src/lib/state/**/*.ts'], [not.server, not.components, not.routes, not.morphInside, not.sequelize, not.node]),
	layer(['src/lib/components/**/*.{ts,svelte}'], [not.server, not.routes, not.morphInside, not.sequelize, not.node]),
	layer(
		['src/lib/server/**/*.ts'],
		[not.routes, not.components, not.state, not.morphInside, not.sequelize, not.models],
		['src/lib/server/db/**', 'src/lib/server/repositories/**', 'src/lib/server/services/**']
	),
	layer(
		['src/lib/server/services/**/*.ts'],
		[not.routes, not.components, not.state, not.morphInside, not.sequelize, not.models, not.svelte]
	),
	layer(
		['src/lib/server/repositories/**/*.ts'],
		[not.routes, not.components, not.state, not.morphInside, not.svelte, not.services]
	),
	layer(
		['src/lib/server/db/**/*.ts'],
		[not.routes, not.components, not.state, not.morphInside, not.svelte, not.services, not.repositories]
	),
	layer(['src/routes/**/*.{ts,svelte}', 'src/hooks*.ts'], [not.repositories, not.database, not.sequelize, not.morph]),
	layer(['src/cli/**/*.ts'], [not.routes, not.components, not.state, not.sequelize, not.models, not.morphInside])
);
