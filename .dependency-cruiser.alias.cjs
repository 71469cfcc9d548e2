// SvelteKit's alias in the form that dependency-cruiser reads; its tsconfig paths come without a base and are not seen.
const { join } = require('node:path');

module.exports = { resolve: { alias: { $lib: join(__dirname, 'src', 'lib') } } };
