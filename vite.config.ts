import tailwindcss from '@tailwindcss/vite';
import { sveltekit } from '@sveltejs/kit/vite';
import { defineConfig } from 'vite';

export default defineConfig({
	plugins: [tailwindcss(), sveltekit()],
	// three and the engine are large on purpose; the bench route loads them alone.
	build: { chunkSizeWarningLimit: 1500 },
	worker: { format: 'es' }
});
