import { loadFrom } from '$lib/api/server';
import type { PageServerLoad } from './$types';

export const load: PageServerLoad = async ({ fetch }) => ({
	studies: await loadFrom(fetch, (api) => api.listStudies())
});
