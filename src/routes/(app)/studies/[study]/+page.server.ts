import { loadFrom } from '$lib/api/server';
import type { PageServerLoad } from './$types';

export const load: PageServerLoad = async ({ fetch, params }) => ({
	shapes: await loadFrom(fetch, (api) => api.listShapes({ id: params.study }))
});
