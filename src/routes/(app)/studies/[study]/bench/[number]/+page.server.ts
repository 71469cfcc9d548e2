import { error } from '@sveltejs/kit';
import { loadFrom } from '$lib/api/server';
import type { PageServerLoad } from './$types';

export const load: PageServerLoad = async ({ fetch, params }) => {
	const shapes = await loadFrom(fetch, (api) => api.listShapes({ id: params.study }));
	const number = /^\d{1,6}$/.test(params.number) ? Number(params.number) : -1;
	const found = shapes.find((shape) => shape.number === number);
	if (!found) error(404, `This study has no shape ${params.number}.`);
	return { shapes, shape: await loadFrom(fetch, (api) => api.getShape({ id: found.id })) };
};
