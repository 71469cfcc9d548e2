import { redirect } from '@sveltejs/kit';
import { loadFrom } from '$lib/api/server';
import type { PageServerLoad } from './$types';

/** `/bench` goes to the newest shape, `/bench?shape=ID` to that one. Without shapes the page says what to do first. */
export const load: PageServerLoad = async ({ fetch, params, url }) => {
	const shapes = await loadFrom(fetch, (api) => api.listShapes({ id: params.study }));
	const wanted = url.searchParams.get('shape');
	const shape = shapes.find((s) => s.id === wanted) ?? shapes.at(-1);
	if (shape) redirect(307, `/studies/${params.study}/bench/${shape.number}`);
};
