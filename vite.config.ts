import tailwindcss from '@tailwindcss/vite';
import { sveltekit } from '@sveltejs/kit/vite';
import { defineConfig } from 'vite';

/**
 * The package numeric compiles functions when it is loaded, which the pages' content policy forbids. Without this every page that
 * takes anything from the engine would load it; so only what solves with it does.
 */
const treeshake = { moduleSideEffects: (id: string) => !/[\\/]node_modules[\\/]numeric[\\/]/.test(id) };

export default defineConfig({
	plugins: [tailwindcss(), sveltekit()],
	// three and the engine are large on purpose; the bench route loads them alone.
	build: { chunkSizeWarningLimit: 1500, rolldownOptions: { treeshake } },
	worker: { format: 'es', rolldownOptions: { treeshake } }
});
